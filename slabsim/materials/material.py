"""A material: relative permittivity and permeability at any frequency in its range."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from slabsim.errors import MaterialError
from slabsim.materials.dispersion import Constant
from slabsim.units import format_spectral, spectral_kind

Dispersion = Callable[[np.ndarray], np.ndarray]
Axes = tuple[Dispersion, Dispersion, Dispersion]
PASSIVE = (
    "with the time factor exp(-i w t) a passive medium has Im(eps) >= 0, Im(mu) >= 0 and k >= 0; "
    "data for exp(+i w t) must be conjugated"
)
_EDGE = 1e-12  # relative rounding of a range end that was written as a wavelength


@dataclass(frozen=True)
class Material:
    """Relative permittivity and permeability as functions of frequency.

    Parameters
    ----------
    name : str
        Name in the stack file.
    electric : callable
        Frequency [Hz], float array, to relative permittivity, complex array of the same shape.
    magnetic : callable, optional
        The same for the relative permeability; None is a non-magnetic material.
    spectral_range : (float, float), optional
        Lowest and highest frequency [Hz] at which `electric` is known; None is everywhere.
    spectral_unit : str
        Unit in which messages write frequencies.

    An anisotropic material has three callables, along x, y and z, in place of one, in `electric`, `magnetic` or both.
    """

    name: str
    electric: Dispersion | Axes
    magnetic: Dispersion | Axes | None = None
    spectral_range: tuple[float, float] | None = None
    spectral_unit: str = "GHz"

    @property
    def is_magnetic(self) -> bool:
        """Whether the permeability differs from 1."""
        return self.magnetic is not None

    @property
    def is_isotropic(self) -> bool:
        """Whether all axes are alike."""
        return not isinstance(self.electric, tuple) and not isinstance(self.magnetic, tuple)

    @property
    def tells_directions(self) -> bool:
        """Whether the x axis differs from the y axis."""
        return any(isinstance(one, tuple) and one[0] != one[1] for one in (self.electric, self.magnetic))

    def permittivity(self, frequency: np.ndarray | float) -> np.ndarray:
        """Relative permittivity; of an anisotropic material the mean sqrt(eps_z sqrt(eps_x eps_y)).

        The mean is what the static field of a sheet at its face sees.

        Parameters
        ----------
        frequency : float array, any shape
            Frequency [Hz].

        Returns
        -------
        complex array, same shape

        Raises
        ------
        MaterialError
            If a frequency lies outside `spectral_range`.
        """
        return _mean(self.permittivity_axes(frequency))

    def permeability(self, frequency: np.ndarray | float) -> np.ndarray:
        """Relative permeability; shapes, units, mean and errors as for `permittivity`."""
        return _mean(self.permeability_axes(frequency))

    def permittivity_axes(self, frequency: np.ndarray | float) -> np.ndarray:
        """Relative permittivity along x, y, z: complex array of shape (3, ...); else as `permittivity`."""
        frequency = np.asarray(frequency, dtype=float)
        return _along_axes(self.electric, self._inside(frequency))

    def permeability_axes(self, frequency: np.ndarray | float) -> np.ndarray:
        """Relative permeability along x, y, z: complex array of shape (3, ...); else as `permittivity`."""
        frequency = self._inside(np.asarray(frequency, dtype=float))
        if self.magnetic is None:
            return np.ones((3, *frequency.shape), dtype=complex)
        return _along_axes(self.magnetic, frequency)

    def _inside(self, frequency: np.ndarray) -> np.ndarray:
        if self.spectral_range is None:
            return frequency
        low, high = self.spectral_range
        inside = (frequency >= low * (1 - _EDGE)) & (frequency <= high * (1 + _EDGE))
        if not np.all(inside):
            offending = float(frequency[~inside].flat[0])
            ends = sorted((low, high), reverse=spectral_kind(self.spectral_unit) == "wavelength")
            first, last = (format_spectral(end, self.spectral_unit) for end in ends)
            raise MaterialError(
                f'material "{self.name}" is not known at {format_spectral(offending, self.spectral_unit)}; '
                f"its data reach from {first} to {last} and are not extrapolated"
            )
        return np.clip(frequency, low, high)


def _along_axes(given: Dispersion | Axes, frequency: np.ndarray) -> np.ndarray:
    if isinstance(given, tuple):
        return np.array([one(frequency) for one in given], dtype=complex)
    return np.broadcast_to(np.asarray(given(frequency), dtype=complex), (3, *frequency.shape))


def _mean(axes: np.ndarray) -> np.ndarray:
    x, y, z = axes
    if np.array_equal(x, z) and np.array_equal(x, y):
        return np.array(x)
    # root by root: so the mean of passive values has Im >= 0, also where one of them is negative
    return np.sqrt(z) * np.sqrt(np.sqrt(x) * np.sqrt(y))


VACUUM = Material("vacuum", Constant())
