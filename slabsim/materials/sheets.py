"""Normalised admittances y = eta0 Y of sheets of zero thickness: z x (h_after - h_before) = y E_t.

Each function gives the part `y0` that depends on frequency alone and the mean permittivity `ee`;
with s2 = (|kt|/k0)^2 the two polarizations see

    sheet      y_TE                        y_TM
    patches    y0 (1 - s2/(2 ee))          y0
    strips     y0                          y0 / (1 - s2/(2 ee))
    film       y0                          y0

Patches and strips: averaged boundary conditions of dense square grids, period well below the
wavelength; the two are dual to each other (Babinet).
"""

from math import log, pi, sin

import numpy as np

from slabsim.constants import ETA0
from slabsim.errors import InputError
from slabsim.units import format_length


def patch_admittance(
    period: float, gap: float, k0: np.ndarray, eps_before: np.ndarray, eps_after: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """Square conducting patches.

    Parameters
    ----------
    period, gap : float
        Period D and gap g between patches [m], 0 < g < D.
    k0 : float array, shape (n_freqs,)
        Vacuum wavenumber [rad/m].
    eps_before, eps_after : complex array, shape (n_freqs,)
        Relative permittivity on the two sides.

    Returns
    -------
    y0, ee : complex array, shape (n_freqs,)
        y0 = y_TM = -2i alpha sqrt(ee), alpha = (k0 sqrt(ee) D/pi) ln(1/sin(pi g/(2D))), and
        ee = (eps_before + eps_after)/2.

    Raises
    ------
    InputError
        If the gap is not between 0 and the period.
    """
    ee = _mean(eps_before, eps_after)
    return -2j * k0 * ee * _grid_length(period, gap, "gap"), ee


def strip_admittance(
    period: float, width: float, k0: np.ndarray, eps_before: np.ndarray, eps_after: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """Square grid of crossed conducting strips of `width` [m]; else as `patch_admittance`.

    Returns
    -------
    y0, ee : complex array, shape (n_freqs,)
        y0 = y_TE = 2i sqrt(ee)/alpha (in which ee cancels), and ee.
    """
    ee = _mean(eps_before, eps_after)
    return 2j / (k0 * _grid_length(period, width, "width")) * np.ones(ee.shape), ee


def film_admittance(
    sheet_resistance: float | None,
    conductivity: float | None,
    thickness: float | None,
    eps_before: np.ndarray,
    eps_after: np.ndarray,
) -> tuple[np.ndarray, np.ndarray]:
    """Resistive film, y0 = eta0/Rs or sigma d eta0.

    Parameters
    ----------
    sheet_resistance : float or None
        Rs [ohm]; if None, the next two count.
    conductivity, thickness : float or None
        sigma [S/m] and d [m] of a film thin against its skin depth.
    eps_before, eps_after : complex array, shape (n_freqs,)
        Relative permittivity on the two sides; gives shape and `ee`, `y0` does not depend on it.

    Returns
    -------
    y0, ee : complex array, shape (n_freqs,)

    Raises
    ------
    InputError
        If neither form is complete.
    """
    if sheet_resistance is not None:
        y0 = ETA0 / sheet_resistance
    elif conductivity is not None and thickness is not None:
        y0 = conductivity * thickness * ETA0
    else:
        raise InputError("a film needs sheet_resistance, or conductivity and thickness")
    ee = _mean(eps_before, eps_after)
    return np.full(ee.shape, complex(y0)), ee


def _grid_length(period: float, opening: float, what: str) -> float:
    if not 0.0 < opening < period:
        given = f"{what} = {format_length(opening)} with period = {format_length(period)}"
        raise InputError(f"{given}; the {what} must lie between 0 and the period")
    return period / pi * log(1.0 / sin(pi * opening / (2.0 * period)))


def _mean(eps_before: np.ndarray, eps_after: np.ndarray) -> np.ndarray:
    return 0.5 * (np.asarray(eps_before, dtype=complex) + np.asarray(eps_after, dtype=complex))
