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
from slabsim.materials.long_sums import order_rule
from slabsim.units import format_length

_REACH = 6.0  # orders are summed until they are so many times the wavenumbers of the media; the rest in closed form
_POWERS = 7  # of 1/p^2 in the closed form: (1/_REACH)^14 is left


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
    In one medium of permeability mu, with k = k0 sqrt(eps mu) and ky = 0,
    z = -i (mu k0 a/2 pi) (1 - kx^2/k^2) [ln(a/(2 pi r)) + sum_{n>=1} (1/sqrt(n^2 - (kt a/2 pi)^2) - 1/n)],
    kt^2 = k^2 - kx^2; the leading logarithm is the classical averaged boundary condition (Kontorovich; from memory),
    the sum that of Wait, Appl. Sci. Res. B 4, 393 (1955; from memory).

    The sum holds to 1e-13 beside any medium, good conductors too; the model holds for |k| r well below 1 in both.
    """
    if not 0.0 < 2.0 * radius < pitch:
        raise InputError(
            f"radius = {format_length(radius)} with pitch = {format_length(pitch)}; "
            "the radius must be positive and less than half the pitch, else neighbouring wires touch"
        )
    step = 2.0 * pi / (k0 * pitch)
    h, s = across / step, along**2
    index2 = [abs(e * m - s) for e, m in zip(eps, mu, strict=True)]
    nodes, weights = order_rule(_REACH * (1.0 + float(np.max(np.sqrt(np.maximum(*index2)) / step, initial=0.0))))
    total = 0.0
    for m, weight in zip(nodes, weights, strict=True):
        for sign in (-1.0, 1.0):
            total = total + weight * _order((step * (m + sign * h)) ** 2, s, eps, mu)
    beyond = round(weights.sum()) + 1
    return total + _tail(beyond, log(pitch / (2.0 * pi * radius)), step, h, _far(s, eps, mu)) + wire


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


def _far(along2: np.ndarray, eps: tuple[np.ndarray, np.ndarray], mu: tuple[np.ndarray, np.ndarray]) -> list[np.ndarray]:
    """Coefficients of 1/|p|, 1/|p|^3, ... in G of a far order p = ky_m/k0.

    With x = 1/p^2, s = (kx/k0)^2 and kz = i k0 p sqrt(1 - b x), b = eps mu - s, of each medium

        G = -i/p [1/A(x) - s/B(x)]/(1 + s x)     A = sum sqrt(1 - b x)/mu, B = sum eps/sqrt(1 - b x) over both media.
    """
    b = [e * m - along2 for e, m in zip(eps, mu, strict=True)]
    root, inverse_root = [1.0], [1.0]  # of 1 - x, by powers
    for n in range(1, _POWERS):
        root.append(root[-1] * (n - 1.5) / n)
        inverse_root.append(inverse_root[-1] * (n - 0.5) / n)
    te = [c * sum(x**n / m for x, m in zip(b, mu, strict=True)) for n, c in enumerate(root)]
    tm = [c * sum(x**n * e for x, e in zip(b, eps, strict=True)) for n, c in enumerate(inverse_root)]
    far: list[np.ndarray] = []
    for one, other in zip(_reciprocal(te), _reciprocal(tm), strict=True):
        before = far[-1] if far else 0.0
        far.append(-1j * (one - along2 * other) - along2 * before)
    return far


def _reciprocal(series: list[np.ndarray]) -> list[np.ndarray]:
    """Power series of one over a power series."""
    result = [1.0 / series[0]]
    for n in range(1, len(series)):
        result.append(-result[0] * sum(series[k] * result[n - k] for k in range(1, n + 1)))
    return result


def _tail(beyond: int, logarithm: float, step: np.ndarray, h: np.ndarray, far: list[np.ndarray]) -> np.ndarray:
    """Orders |m| >= `beyond`, p = step |m + h|, cut off by the radius of the wire."""
    from scipy.special import digamma, zeta

    up, down = beyond + h, beyond - h
    total = far[0] / step * (2.0 * (logarithm - np.euler_gamma) - digamma(up) - digamma(down))
    for j, coefficient in enumerate(far[1:], start=1):
        n = 2 * j + 1
        total = total + coefficient / step**n * (zeta(n, up) + zeta(n, down))
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
