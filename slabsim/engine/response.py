"""Reflection and transmission of a stack: checks, packs, calls the kernel, returns."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from slabsim.engine import kernels
from slabsim.engine.pack import Recipe, pack
from slabsim.errors import InputError
from slabsim.stack.sample import Model, Polarization, Stack


@dataclass(frozen=True)
class Response:
    """Amplitudes and powers on a grid, arrays of shape (n_pol, n_freqs, n_angles).

    Attributes
    ----------
    polarizations : tuple of {"TE", "TM"}
        First axis.
    r, t : complex arrays
        Ratios of electric-field amplitudes (`slabsim.engine`); `t` is None before a perfect conductor.
    R, T : float arrays
        Reflected and transmitted share of the incident power; `T` is None before a perfect conductor.
    A : float array
        Absorbed share, 1 - R - T.
    """

    polarizations: tuple[Polarization, ...]
    r: np.ndarray
    t: np.ndarray | None
    R: np.ndarray
    T: np.ndarray | None
    A: np.ndarray


class Solver:
    """Solves one stack with one model of the wires, as often as one likes.

    Parameters
    ----------
    stack : Stack
    model : {"nonlocal", "local"}, optional
        Default: the model of the stack's sweep.
    polarizations : tuple of {"TE", "TM"}, optional
        Default: those of the stack's sweep.
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

    def solve(self, frequencies: np.ndarray | float, angles_deg: np.ndarray | float) -> Response:
        """Solve a grid.

        Parameters
        ----------
        frequencies : float array, shape (n_freqs,)
            [Hz], positive.
        angles_deg : float array, shape (n_angles,)
            Polar angles of incidence [degrees], 0 <= angle < 90.

        Returns
        -------
        Response
            A point that cannot be solved is NaN.

        Raises
        ------
        InputError
            If a frequency or an angle is out of bounds.
        MaterialError
            If a material is not known at one of the frequencies.
        """
        frequencies, angles_deg = check_grid(frequencies, angles_deg)
        recipe = pack(self.stack, self.model, frequencies)
        return self._respond(recipe, *squares(angles_deg))

    def _respond(self, recipe: Recipe, sin2: np.ndarray, cos2: np.ndarray) -> Response:
        wanted = np.array([recipe.metal_back, "TE" in self.polarizations, "TM" in self.polarizations])
        shape = (recipe.media.shape[1], sin2.size)
        amplitudes = np.empty((len(self.polarizations), 2, *shape), dtype=complex)
        powers = np.empty((len(self.polarizations), 3, *shape))
        recipe_arrays = recipe.kinds, recipe.rows, recipe.tables, recipe.media
        kernels.solve(*recipe_arrays, sin2, cos2, wanted, amplitudes, powers)
        if self.polarizations == ("TM", "TE"):  # the kernel's order is TE, TM
            amplitudes, powers = amplitudes[::-1], powers[::-1]
        r, R, A = amplitudes[:, 0], powers[:, 0], powers[:, 2]
        if recipe.metal_back:
            return Response(self.polarizations, r, None, R, None, A)
        return Response(self.polarizations, r, amplitudes[:, 1], R, powers[:, 1], A)


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
