"""The edge of a set of thin metal plates normal to a face: what it reflects, and with which phase.

Plates at y = m b, z > 0, perfectly conducting; a wave comes from z < 0 in the same medium. Parallel to the plates there
is a common factor exp(i kx x), which only lowers the wavenumber to k^2 - kx^2; what is left is scalar.

    E along the plates    Ex = 0 on them     modes inside kappa_m = sqrt(k^2 - (m pi/b)^2), m = 1, 2, ...
    E across the plates   dHx/dy = 0         the same with m = 0 as well

Continuity at z = 0 gives, with the orders kz_n = sqrt(k^2 - (ky + 2 pi n/b)^2) outside, sums over 1/(kz_n -+ kappa_m),
which a meromorphic function solves: poles at the kappa_m, zeros at the kz_n. With kappa the mode that carries the
power, the edge is a step of admittance from kz_0 to kappa between two short lines of phase:

    r_outside = (kz_0 - kappa)/(kz_0 + kappa) e_outside^2      r_inside = -(kz_0 - kappa)/(kz_0 + kappa) e_inside^2
    t t' = 4 kz_0 kappa/(kz_0 + kappa)^2 e_outside^2 e_inside^2

    e_outside^2 = F(-kz_0)/F(kz_0)     e_inside^2 = F(kappa)/F(-kappa)
    F(w) = product over the other orders of (1 - w/kz_n), over the product over the other modes of (1 - w/kappa_m)

Carlson and Heins, Q. Appl. Math. 4, 313 (1947) and 5, 82 (1947), solve the same by the Wiener-Hopf method.
"""

from __future__ import annotations

from typing import Literal, NamedTuple

import numpy as np

from slabsim.materials.long_sums import order_rule

Field = Literal["along", "across"]
_REACH = 6.0  # factors are multiplied until p is so many times u (see `_ratio`); the rest in closed form
_POWERS = 6  # of 1/p^2 in the closed form: (1/_REACH)^14 is left


class Edge(NamedTuple):
    """kz of the order outside, kappa of the mode inside [rad/m], and the two phase factors squared; complex arrays."""

    outside: np.ndarray
    inside: np.ndarray
    phase_outside: np.ndarray
    phase_inside: np.ndarray


def plate_edge(k2: np.ndarray, ky: np.ndarray, spacing: float, field: Field) -> Edge:
    """Edge of a semi-infinite set of plates.

    Parameters
    ----------
    k2 : complex array, any shape
        k^2 - kx^2 [1/m^2] of the medium around and between the plates.
    ky : float array, same shape
        Wavenumber across the plates [rad/m].
    spacing : float
        b [m].
    field : {"along", "across"}
        Direction of the electric field against the plates.

    Returns
    -------
    Edge
        Meaningful below the onset of diffraction (`plates_diffract`).
    """
    unit = np.pi / spacing
    u2, v = np.asarray(k2, dtype=complex) / unit**2, abs(ky) / unit  # both signs of ky are alike
    outside = _root(u2 - v**2)
    inside = _root(u2 - 1.0) if field == "along" else _root(u2)
    first = 2 if field == "along" else 1
    phase_outside = 1.0 / _ratio(outside, u2, v, first)
    return Edge(outside * unit, inside * unit, phase_outside, _ratio(inside, u2, v, first))


def plates_diffract(k2: np.ndarray, ky: np.ndarray, spacing: float, field: Field) -> np.ndarray:
    """Whether a second order propagates outside, or inside a second mode that the wave excites."""
    unit = np.pi / spacing
    u2, v = np.real(k2) / unit**2, abs(ky) / unit
    diffracts = u2 >= (2.0 - v) ** 2
    # at ky = 0 a field across the plates excites no second mode
    return diffracts if field == "along" else diffracts | ((v > 0.0) & (u2 >= 1.0))


def _root(z: np.ndarray) -> np.ndarray:
    root = np.sqrt(z)
    return np.where(root.imag < 0.0, -root, root)


def _ratio(w: np.ndarray, u2: np.ndarray, v: np.ndarray, first: int) -> np.ndarray:
    """F(w)/F(-w) in units of pi/b; the modes from m = `first` on.

    A factor with kz = i q gives (q + i w)/(q - i w) = exp(2 i atan(w/q)), q = sqrt(p^2 - u^2), p = 2n +- v for the
    orders and p = m for the modes. The orders n, -n are taken together with the modes 2n - 1, 2n: cut off so, the
    product has the growth that the edge condition asks for.
    """
    nodes, weights = order_rule(8.0 + 0.5 * _REACH * float(np.max(np.sqrt(abs(u2)), initial=0.0)))
    product = np.ones(np.broadcast_shapes(w.shape, u2.shape, np.shape(v)), dtype=complex)
    for n, weight in zip(nodes, weights, strict=True):
        factor = _factor(2.0 * n + v, w, u2) * _factor(2.0 * n - v, w, u2) / _factor(2.0 * n, w, u2)
        if 2.0 * n - 1.0 >= first:
            factor = factor / _factor(2.0 * n - 1.0, w, u2)
        product = product * (factor if weight == 1.0 else factor**weight)
    return product * np.exp(2j * _tail(round(weights.sum()) + 1, w, u2, 0.5 * v))


def _factor(p: np.ndarray | float, w: np.ndarray, u2: np.ndarray) -> np.ndarray:
    q = np.sqrt(p**2 - u2)
    return (q + 1j * w) / (q - 1j * w)


def _tail(beyond: int, w: np.ndarray, u2: np.ndarray, half: np.ndarray) -> np.ndarray:
    """Sum of atan(w/q) over the orders less that over the modes, n >= `beyond`, by powers of 1/p."""
    from scipy.special import binom, digamma, zeta

    up, down = beyond + half, beyond - half
    total = 0.5 * w * (digamma(beyond - 0.5) + digamma(beyond) - digamma(up) - digamma(down))
    odd = [w]  # the terms of atan w by powers, less the factors 1/(2i + 1)
    for j in range(1, _POWERS + 1):
        odd = [one * u2 for one in odd] + [-odd[-1] * w**2]
        coefficient = sum(one * binom(j - 0.5, j - i) / (2 * i + 1) for i, one in enumerate(odd))
        n = 2 * j + 1
        sums = zeta(n, up) + zeta(n, down) - zeta(n, beyond - 0.5) - zeta(n, beyond)
        total = total + coefficient * sums / 2.0**n
    return total
