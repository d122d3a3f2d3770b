"""One wire and its lattice: plasma wavenumber, fill fraction, internal impedance."""

from math import log, pi, sqrt, tanh
from typing import Literal

import numpy as np

from slabsim.constants import C0, EPS0, TWO_PI
from slabsim.errors import InputError, MaterialError
from slabsim.materials.material import VACUUM, Material
from slabsim.units import format_frequency, format_length

Formula = Literal["lattice", "logarithmic", "gap"]
FORMULAS: tuple[Formula, ...] = ("lattice", "logarithmic", "gap")
_ASYMPTOTIC = 1e4  # Im(km r) beyond which four terms of J0/J1 are exact to rounding


def plasma_wavenumber(
    pitch: float | tuple[float, float],
    radius: float,
    formula: Formula | float = "lattice",
    host: Material = VACUUM,
) -> float:
    """Plasma wavenumber of a rectangular lattice of parallel wires.

    Parameters
    ----------
    pitch : float or (float, float)
        Sides p, q of the cell [m]; one number is a square cell.
    radius : float
        Wire radius r [m], less than half the smaller side.
    formula : {"lattice", "logarithmic", "gap"} or float
        Which formula; or the frequency [Hz] at which the sample, host included, has its plasma edge.
    host : Material
        Medium between the wires; matters for a given frequency only.

    Returns
    -------
    float
        kp [rad/m], of the wires in vacuum.

    Raises
    ------
    InputError
        If neighbouring wires touch, or the formula is unknown or has no solution.
    MaterialError
        If a plasma frequency is given at which the host has Re(eps) <= 0.

    Notes
    -----
    With s = sqrt(p q)::

        lattice       kp^2 = 2 pi / (s^2 [ln(s/(2 pi r)) + F(p/q)])      thin wires
        logarithmic   kp^2 = 2 pi / (s^2 ln(s/r))
        gap           kp^2 = 2 pi / (s^2 ln(s^2/(4 r (s - r))))
        frequency     kp   = 2 pi f sqrt(Re eps_host(f)) / c

    The logarithmic and the gap formula are meant for square cells (p = q); for a rectangular cell they
    are taken at the square of equal area.
    """
    p, q = _sides(pitch, radius)
    if isinstance(formula, float | int):
        eps = float(host.permittivity(formula).real)
        if not eps > 0.0:
            raise MaterialError(
                f'material "{host.name}" has Re(eps) = {eps:g} at the plasma frequency {format_frequency(formula)}; '
                "a plasma edge needs a host with Re(eps) > 0 there"
            )
        return TWO_PI * formula * sqrt(eps) / C0
    s = sqrt(p * q)
    if formula == "lattice":
        denominator = log(s / (TWO_PI * radius)) + lattice_constant(p / q)
    elif formula == "logarithmic":
        denominator = log(s / radius)
    elif formula == "gap":
        denominator = log(s**2 / (4.0 * radius * (s - radius)))
    else:
        raise InputError(f"formula is {formula!r}; it must be one of {', '.join(FORMULAS)} or a frequency [Hz]")
    if not denominator > 0.0:
        raise InputError(
            f"the {formula} formula has no solution at radius = {format_length(radius)}, pitch = {_cell(p, q)}; "
            "it is meant for wires thin against the pitch"
        )
    return sqrt(TWO_PI / denominator) / s


def lattice_constant(aspect: float) -> float:
    """F(u) = -ln(u)/2 + sum_{n>=1} [coth(pi n u) - 1]/n + pi u/6, u = `aspect` = p/q; F(1) = 0.527344.

    Notes
    -----
    F(u) = F(1/u) exactly, F being -ln[sqrt(u) eta(iu)^2] with Dedekind's eta function; summed with
    u >= 1 the terms fall as exp(-2 pi n u) and twelve of them reach the last digit.
    """
    u = max(aspect, 1.0 / aspect)
    terms = ((1.0 / tanh(pi * n * u) - 1.0) / n for n in range(1, 13))
    return -0.5 * log(u) + sum(terms) + pi * u / 6.0


def fill_fraction(pitch: float | tuple[float, float], radius: float) -> float:
    """Share pi r^2/(p q) of the cell that the wire takes; lengths [m] as in `plasma_wavenumber`."""
    p, q = _sides(pitch, radius)
    return pi * radius**2 / (p * q)


def internal_impedance(
    radius: float,
    eps_metal: np.ndarray,
    frequency: np.ndarray,
    eps_host: np.ndarray | complex = 1.0,
) -> np.ndarray:
    """Internal impedance per length of a round wire, skin effect included.

    Parameters
    ----------
    radius : float
        Wire radius r [m].
    eps_metal : complex array, shape (n_freqs,)
        Relative permittivity of the metal, conductivity included.
    frequency : float array, shape (n_freqs,)
        Frequency [Hz].
    eps_host : complex or complex array, shape (n_freqs,)
        Permittivity whose displacement current is already counted outside the wire model.

    Returns
    -------
    complex array, shape (n_freqs,)
        Zw = km J0(km r)/(2 pi r sigma J1(km r)) [ohm/m], sigma = -i w eps0 (eps_metal - eps_host),
        km = k0 sqrt(eps_metal); 1/(sigma pi r^2) for wires thin against the skin depth.

    Notes
    -----
    The ratio of exponentially scaled Bessel functions neither over- nor underflows; for
    Im(km r) > 1e4 it is J0/J1 = -i [1 + i/(2z) - 3/(8z^2) - 3i/(8z^3)] + O(z^-4), from the Riccati
    equation rho' = -1 - rho^2 + rho/z of the ratio.
    """
    frequency = np.asarray(frequency, dtype=float)
    eps_metal = np.asarray(eps_metal, dtype=complex)
    sigma = -1j * TWO_PI * frequency * EPS0 * (eps_metal - eps_host)
    z = TWO_PI * frequency / C0 * np.sqrt(eps_metal) * radius
    return z * _j0_over_j1(z) / (TWO_PI * radius**2 * sigma)


def _j0_over_j1(z: np.ndarray) -> np.ndarray:
    from scipy.special import jve

    far = z.imag > _ASYMPTOTIC
    near = np.where(far, 1.0, z)
    inverse = 1.0 / np.where(far, z, 1.0)
    series = -1j * (1.0 + inverse * (0.5j + inverse * (-0.375 - 0.375j * inverse)))
    return np.where(far, series, jve(0, near) / jve(1, near))


def _sides(pitch: float | tuple[float, float], radius: float) -> tuple[float, float]:
    p, q = pitch if isinstance(pitch, tuple | list) else (pitch, pitch)
    if not 0.0 < 2.0 * radius < min(p, q):
        raise InputError(
            f"radius = {format_length(radius)} with pitch = {_cell(p, q)}; "
            "the radius must be positive and less than half the smaller pitch, else neighbouring wires touch"
        )
    return float(p), float(q)


def _cell(p: float, q: float) -> str:
    return format_length(p) if p == q else f"{format_length(p)} by {format_length(q)}"
