"""Dispersion models: frequency [Hz] to relative permittivity or permeability.

Time factor exp(-i w t): loss is a positive imaginary part. Each model is a small frozen callable,
float array of any shape to complex array of the same shape. A pole on the real axis gives inf or NaN,
which whoever reads the stack refuses.
"""

from dataclasses import dataclass

import numpy as np

from slabsim.constants import C0, EPS0, TWO_PI


@dataclass(frozen=True)
class Constant:
    """eps (1 + i tan d) + i sigma/(w eps0).

    Parameters
    ----------
    value : float
        Relative permittivity (or permeability).
    loss_tangent : float
        tan d.
    conductivity : float
        DC conductivity sigma [S/m].
    """

    value: float = 1.0
    loss_tangent: float = 0.0
    conductivity: float = 0.0

    def __call__(self, frequency: np.ndarray) -> np.ndarray:
        bound = np.full(np.shape(frequency), self.value * (1.0 + 1j * self.loss_tangent))
        if self.conductivity == 0.0:
            return bound
        return bound + 1j * self.conductivity / (TWO_PI * frequency * EPS0)


@dataclass(frozen=True)
class Drude:
    """background - wp^2/(w^2 + i w g); `plasma` and `collision` are wp and g over 2 pi [Hz]."""

    plasma: float
    collision: float
    background: float = 1.0

    def __call__(self, frequency: np.ndarray) -> np.ndarray:
        return self.background - self.plasma**2 / (frequency * (frequency + 1j * self.collision))


@dataclass(frozen=True)
class Oscillator:
    """strength f0^2/(f0^2 - f^2 - i f G), `resonance` f0 and `damping` G [Hz], `strength` without unit."""

    resonance: float
    strength: float
    damping: float

    def __call__(self, frequency: np.ndarray) -> np.ndarray:
        f0 = self.resonance
        with np.errstate(divide="ignore", invalid="ignore"):
            return self.strength * f0**2 / (f0**2 - frequency**2 - 1j * frequency * self.damping)


@dataclass(frozen=True)
class Lorentz:
    """background + sum of the `oscillators`."""

    background: float
    oscillators: tuple[Oscillator, ...]

    def __call__(self, frequency: np.ndarray) -> np.ndarray:
        terms = (oscillator(frequency) for oscillator in self.oscillators)
        return sum(terms, start=np.full(np.shape(frequency), complex(self.background)))


@dataclass(frozen=True)
class Debye:
    """infinity + (static - infinity)/(1 - i w tau), `relaxation` tau [s]."""

    static: float
    infinity: float
    relaxation: float

    def __call__(self, frequency: np.ndarray) -> np.ndarray:
        return self.infinity + (self.static - self.infinity) / (1 - 1j * TWO_PI * frequency * self.relaxation)


@dataclass(frozen=True)
class Sellmeier:
    """n^2 = 1 + sum B l^2/(l^2 - C^2), vacuum wavelength l and `resonances` C [m]."""

    strengths: tuple[float, ...]
    resonances: tuple[float, ...]

    def __call__(self, frequency: np.ndarray) -> np.ndarray:
        wavelength2 = (C0 / frequency) ** 2
        with np.errstate(divide="ignore", invalid="ignore"):
            pairs = zip(self.strengths, self.resonances, strict=True)
            n2 = 1.0 + sum(b * wavelength2 / (wavelength2 - c**2) for b, c in pairs)
        return np.asarray(n2, dtype=complex)


@dataclass(frozen=True)
class ResonantPermeability:
    """1 - F f^2/(f^2 - f0^2 + i G f), `resonance` f0 and `damping` G [Hz], `strength` F without unit."""

    resonance: float
    strength: float
    damping: float

    def __call__(self, frequency: np.ndarray) -> np.ndarray:
        with np.errstate(divide="ignore", invalid="ignore"):
            quotient = frequency**2 / (frequency**2 - self.resonance**2 + 1j * self.damping * frequency)
            return 1.0 - self.strength * quotient
