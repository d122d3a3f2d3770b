"""Reflection and transmission of a stack: checks, packs, calls the kernels, returns."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from slabsim.engine.pack import Recipe, pack, takes_scalar_path
from slabsim.errors import InputError
from slabsim.stack.sample import Channel, Model, Polarization, Stack

if TYPE_CHECKING:
    from slabsim.engine.port_pack import PortRecipe

_POLARIZATIONS: tuple[Polarization, ...] = ("TE", "TM")
_CHANNELS: dict[Channel, tuple[int, int]] = {"TE": (0, 0), "TM": (1, 1), "TE_to_TM": (0, 1), "TM_to_TE": (1, 0)}


@dataclass(frozen=True)
class Response:
    """Amplitudes and powers on a grid.

    Attributes
    ----------
    channels : tuple of {"TE", "TM", "TE_to_TM", "TM_to_TE"}
        First axis of r, t, R, T: the incident polarizations, then, if the stack mixes them, what each sends into the
        other one.
    incident : tuple of {"TE", "TM"}
        First axis of A.
    r, t : complex arrays, shape (n_channels, n_freqs, n_angles)
        Ratios of electric-field amplitudes (`slabsim.engine`); `t` is None before a perfect conductor.
    R, T : float arrays, shape (n_channels, n_freqs, n_angles)
        Reflected and transmitted share of the incident power; `T` is None before a perfect conductor.
    A : float array, shape (n_incident, n_freqs, n_angles)
        Absorbed share, 1 minus all R and T of that incident polarization.
    """

    channels: tuple[Channel, ...]
    incident: tuple[Polarization, ...]
    r: np.ndarray
    t: np.ndarray | None
    R: np.ndarray
    T: np.ndarray | None
    A: np.ndarray


class Solver:
    """Solves one stack with one model of the wires, as often as one likes.

    Stacks whose polarizations stay apart take the scalar kernels, all others the four-port engine.

    Parameters
    ----------
    stack : Stack
    model : {"nonlocal", "local"}, optional
        Default: the model of the stack's sweep.
    polarizations : tuple of {"TE", "TM"}, optional
        Of the incident wave. Default: those of the stack's sweep.
    """

    def __init__(
        self,
        stack: Stack,
        model: Model | None = None,
        polarizations: tuple[Polarization, ...] | None = None,
    ) -> None:
        self.stack = stack
        self.model: Model = model or stack.sweep.model
        self.polarizations = polarizations or stack.sweep.polarizations
        if self.model not in ("nonlocal", "local"):
            raise InputError(f"model is {self.model!r}; it must be 'nonlocal' or 'local'")
        if not set(self.polarizations) <= {"TE", "TM"}:
            raise InputError(f"polarizations is {self.polarizations!r}; each must be 'TE' or 'TM'")
        self.is_scalar = takes_scalar_path(stack)
        self.channels = stack.channels_of(self.polarizations)

    def solve(
        self, frequencies: np.ndarray | float, angles_deg: np.ndarray | float, azimuth_deg: float = 0.0
    ) -> Response:
        """Solve a grid at one azimuth.

        Parameters
        ----------
        frequencies : float array, shape (n_freqs,)
            [Hz], positive.
        angles_deg : float array, shape (n_angles,)
            Polar angles of incidence [degrees], 0 <= angle < 90.
        azimuth_deg : float
            Azimuth of the plane of incidence [degrees].

        Returns
        -------
        Response
            A point that cannot be solved is NaN.

        Raises
        ------
        InputError
            If a frequency or an angle is out of bounds, or the azimuth is not one at which plates can be solved.
        MaterialError
            If a material is not known at one of the frequencies.
        """
        frequencies, angles_deg = check_grid(frequencies, angles_deg)
        if not np.isfinite(azimuth_deg):
            raise InputError(f"azimuth_deg = {azimuth_deg}; it must be a finite number of degrees")
        if self.is_scalar:
            return self._respond(pack(self.stack, self.model, frequencies), *squares(angles_deg))
        from slabsim.engine.port_pack import pack_ports

        recipe = pack_ports(self.stack, self.model, frequencies, angles_deg, azimuth_deg)
        return self._respond_ports(recipe, *squares(angles_deg))

    def _respond(self, recipe: Recipe, sin2: np.ndarray, cos2: np.ndarray) -> Response:
        from slabsim.engine import kernels

        wanted = np.array([recipe.metal_back, "TE" in self.polarizations, "TM" in self.polarizations])
        shape = (recipe.media.shape[1], sin2.size)
        amplitudes = np.empty((len(self.polarizations), 2, *shape), dtype=complex)
        powers = np.empty((len(self.polarizations), 3, *shape))
        recipe_arrays = recipe.kinds, recipe.rows, recipe.tables, recipe.media
        kernels.solve(*recipe_arrays, sin2, cos2, wanted, amplitudes, powers)
        if self.polarizations == ("TM", "TE"):  # the kernel's order is TE, TM
            amplitudes, powers = amplitudes[::-1], powers[::-1]
        r, R, A = amplitudes[:, 0], powers[:, 0], powers[:, 2]
        t, T = (None, None) if recipe.metal_back else (amplitudes[:, 1], powers[:, 1])
        return Response(self.channels, self.polarizations, r, t, R, T, A)

    def _respond_ports(self, recipe: PortRecipe, sin2: np.ndarray, cos2: np.ndarray) -> Response:
        from slabsim.engine import ports

        shape = (2, 2, 2, recipe.media.shape[1], sin2.size)
        amplitudes, powers = np.empty(shape, dtype=complex), np.empty(shape)
        ports.solve_ports(recipe.arrays, sin2, cos2, recipe.metal_back, recipe.n_ports, amplitudes, powers)
        absorbed = 1.0 - powers.sum(axis=(0, 2))
        if recipe.diffracts.any():
            marks = recipe.diffracts | (self.stack.mixes_polarizations & recipe.diffracts.any(axis=0))
            lost = marks[:, None] | marks[None, :]
            amplitudes[:, lost], powers[:, lost], absorbed[marks] = np.nan, np.nan, np.nan
        A = absorbed[[_POLARIZATIONS.index(one) for one in self.polarizations]]
        into, out = zip(*(_CHANNELS[channel] for channel in self.channels), strict=True)
        (r, t), (R, T) = amplitudes[:, into, out], powers[:, into, out]
        if recipe.metal_back:
            return Response(self.channels, self.polarizations, r, None, R, None, A)
        return Response(self.channels, self.polarizations, r, t, R, T, A)


def check_grid(frequencies: np.ndarray | float, angles_deg: np.ndarray | float) -> tuple[np.ndarray, np.ndarray]:
    """Frequencies [Hz] and angles [degrees] as one-dimensional float arrays, or an InputError."""
    frequencies = np.atleast_1d(np.asarray(frequencies, dtype=float))
    angles_deg = np.atleast_1d(np.asarray(angles_deg, dtype=float))
    if not np.all((frequencies > 0.0) & np.isfinite(frequencies)):
        raise InputError(f"frequencies = {frequencies}; every frequency must be positive and finite [Hz]")
    if not np.all((angles_deg >= 0.0) & (angles_deg < 90.0)):
        raise InputError(f"angles_deg = {angles_deg}; every angle must satisfy 0 <= angle < 90")
    return frequencies, angles_deg


def squares(angles_deg: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """sin^2 and cos^2 of angles [degrees]; the cosine from 90 - angle, to keep its digits at grazing."""
    return np.sin(np.deg2rad(angles_deg)) ** 2, np.sin(np.deg2rad(90.0 - angles_deg)) ** 2
