"""One plane of parallel wires as a sheet: its impedance for the zero diffraction order, exact for thin wires.

A current J along the wires (mean density in the plane, times eta0) radiates into the diffraction orders
kt_m = (kx, ky + 2 pi m/a), x along the wires. The field of order m along the wires is -G_m J,

    G_m = (kx^2/kt_m^2)/(Y_TM1 + Y_TM2) + (ky_m^2/kt_m^2)/(Y_TE1 + Y_TE2)     Y_TM = eps k0/kz, Y_TE = kz/(mu k0)

with the admittances of the media on both sides. On the wire the total field is zero (or Zw I), so that the zero order
sees E.n = z J with z = sum_{m != 0} G_m + Zw a/eta0; the sum converges to a logarithm of the wire radius.
"""

from __future__ import annotations

from math import log, pi

import numpy as np

from slabsim.errors import InputError
from slabsim.units import format_length

_TERMS = 24  # orders on each side that are summed one by one; the rest in closed form to order |m|^-7


def grid_impedance(
    pitch: float,
    radius: float,
    k0: np.ndarray,
    along: np.ndarray,
    across: np.ndarray,
    eps: tuple[np.ndarray, np.ndarray],
    mu: tuple[np.ndarray, np.ndarray],
    wire: np.ndarray | complex = 0.0,
) -> np.ndarray:
    """Normalised impedance z of a plane of parallel wires between two isotropic media.

    Parameters
    ----------
    pitch, radius : float
        Distance a of the wires and their radius r [m], 0 < 2 r < a; the wires are thin: r well below a.
    k0 : float array
        Vacuum wavenumber [rad/m]; this and all that follows broadcasts to one shape (points).
    along, across : float arrays
        kx/k0 along and ky/k0 across the wires.
    eps, mu : pairs of complex arrays
        Relative permittivity and permeability in front and behind.
    wire : complex array
        Zw a/eta0 of the wires themselves, 0 for a perfect conductor.

    Returns
    -------
    complex array, shape of the points
        E.n = z J for the zero order. Meaningful below the onset of diffraction (`diffracts`).

    Raises
    ------
    InputError
        If the wires overlap.

    Notes
    -----
    In a homogeneous medium and at normal incidence
    z = -i (k0 a/2 pi) [ln(a/(2 pi r)) + sum_{n>=1} (1/sqrt(n^2 - (k a/2 pi)^2) - 1/n)] eta/eta0-units; the leading
    logarithm is the classical averaged boundary condition (Kontorovich; from memory), the sum that of Wait, Appl. Sci.
    Res. B 4, 393 (1955; from memory).
    """
    if not 0.0 < 2.0 * radius < pitch:
        raise InputError(
            f"radius = {format_length(radius)} with pitch = {format_length(pitch)}; "
            "the radius must be positive and less than half the pitch, else neighbouring wires touch"
        )
    from scipy.special import digamma

    step = 2.0 * pi / (k0 * pitch)
    h = across / step
    coefficients = _far(along**2, eps, mu)
    leading = 2.0 * log(pitch / (2.0 * pi * radius)) - digamma(1.0 + h) - digamma(1.0 - h) - 2.0 * np.euler_gamma
    total = coefficients[0] * leading / step
    for sign in (-1.0, 1.0):
        total = total + _one_side(step, sign * h, along**2, eps, mu, coefficients)
    return total + wire


def diffracts(
    pitch: float,
    k0: np.ndarray,
    along: np.ndarray,
    across: np.ndarray,
    eps: tuple[np.ndarray, np.ndarray],
    mu: tuple[np.ndarray, np.ndarray],
) -> np.ndarray:
    """Whether an order other than the zero order propagates beside the grid; arguments as for `grid_impedance`."""
    nearest = abs(across) - 2.0 * pi / (k0 * pitch)
    index2 = np.maximum(*((e * m).real for e, m in zip(eps, mu, strict=True)))
    return index2 >= along**2 + nearest**2


def _far(
    along2: np.ndarray, eps: tuple[np.ndarray, np.ndarray], mu: tuple[np.ndarray, np.ndarray]
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Coefficients of 1/|p|, 1/|p|^3, 1/|p|^5 in G of a far order p = ky_m/k0."""
    b = [e * m - along2 for e, m in zip(eps, mu, strict=True)]
    te, tm = 1.0 / mu[0] + 1.0 / mu[1], eps[0] + eps[1]
    e1, e2 = (sum(x**n / m for x, m in zip(b, mu, strict=True)) / te for n in (1, 2))
    f1, f2 = (sum(x**n * e for x, e in zip(b, eps, strict=True)) / tm for n in (1, 2))
    s = along2
    first = 1.0 / te - s / tm
    third = (0.5 * e1 - s) / te + s * (0.5 * f1 + s) / tm
    fifth = (0.125 * e2 + 0.25 * e1**2 - 0.5 * s * e1 + s**2) / te
    fifth = fifth - s * (0.25 * f1**2 - 0.375 * f2 + 0.5 * s * f1 + s**2) / tm
    return -1j * first, -1j * third, -1j * fifth


def _one_side(
    step: np.ndarray,
    h: np.ndarray,
    along2: np.ndarray,
    eps: tuple[np.ndarray, np.ndarray],
    mu: tuple[np.ndarray, np.ndarray],
    coefficients: tuple[np.ndarray, ...],
) -> np.ndarray:
    """Orders p = step (m + h), m = 1, 2, ..., less the leading term of each."""
    from scipy.special import zeta

    total = 0.0
    for m in range(1, _TERMS + 1):
        p = step * (m + h)
        far = [c / p**n for c, n in zip(coefficients, (1, 3, 5), strict=True)]
        rest = _order(p**2, along2, eps, mu) - sum(far)
        total = total + rest
    # what is left falls as |p|^-7
    total = total + rest * (_TERMS + h) ** 7 * zeta(7, _TERMS + 1 + h)
    for c, n in zip(coefficients[1:], (3, 5), strict=True):
        total = total + c * zeta(n, 1.0 + h) / step**n
    return total


def _order(
    p2: np.ndarray, along2: np.ndarray, eps: tuple[np.ndarray, np.ndarray], mu: tuple[np.ndarray, np.ndarray]
) -> np.ndarray:
    """G of one order, p2 = (ky_m/k0)^2."""
    kt2 = p2 + along2
    kz = [np.sqrt(e * m - kt2 + 0j) for e, m in zip(eps, mu, strict=True)]
    kz = [np.where(one.imag < 0.0, -one, one) for one in kz]
    te = kz[0] / mu[0] + kz[1] / mu[1]
    tm = eps[0] / kz[0] + eps[1] / kz[1]
    return (along2 / tm + p2 / te) / kt2
