"""A material: relative permittivity and permeability at any frequency in its range."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from slabsim.errors import MaterialError
from slabsim.materials.dispersion import Constant
from slabsim.units import format_spectral, spectral_kind

Dispersion = Callable[[np.ndarray], np.ndarray]
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
    """

    name: str
    electric: Dispersion
    magnetic: Dispersion | None = None
    spectral_range: tuple[float, float] | None = None
    spectral_unit: str = "GHz"

    @property
    def is_magnetic(self) -> bool:
        """Whether the permeability differs from 1."""
        return self.magnetic is not None

    def permittivity(self, frequency: np.ndarray | float) -> np.ndarray:
        """Relative permittivity.

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
        frequency = np.asarray(frequency, dtype=float)
        return np.asarray(self.electric(self._inside(frequency)), dtype=complex)

    def permeability(self, frequency: np.ndarray | float) -> np.ndarray:
        """Relative permeability; shapes, units and errors as for `permittivity`."""
        frequency = self._inside(np.asarray(frequency, dtype=float))
        if self.magnetic is None:
            return np.ones(frequency.shape, dtype=complex)
        return np.asarray(self.magnetic(frequency), dtype=complex)

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


VACUUM = Material("vacuum", Constant())
