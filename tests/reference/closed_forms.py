"""Closed forms of one slab of open wires in air, TM, that share nothing with the dense solver."""

from __future__ import annotations

from typing import Any

import mpmath as mp

from tests.reference.layers import Number


def open_slab(
    k0: Number,
    theta: Number,
    kp: Number,
    thickness: Number,
    eps: Number,
    mu: Number = 1,
    zeta: Number = 0,
    digits: int = 50,
) -> tuple[complex, complex]:
    """(r, t) from the two modes of the nonlocal permittivity, even and odd parts, zero current at both faces.

    The modes solve eps_zz(kz) (kz^2 - mu ke^2) = -eps kx^2 with ke^2 = k0^2 eps and
    eps_zz = eps - (kp/k0)^2 / (1 + i zeta kp^2/k0 - kz^2/ke^2); a mode of field hy carries the current
    w = i kx hy (1 - eps/eps_zz). Derived here. An opaque slab takes more `digits` than t has zeros.
    """
    with mp.workdps(digits):
        k0, theta, kp, thickness = map(mp.mpmathify, (k0, theta, kp, thickness))
        eps, mu, zeta = map(mp.mpmathify, (eps, mu, zeta))
        kx, kz0, ke2 = k0 * mp.sin(theta), k0 * mp.cos(theta), k0**2 * eps
        s, plasma = 1 + 1j * zeta * kp**2 / k0, kp**2 / k0**2
        # a X^2 + b X + c = 0 for X = kz^2
        a = -eps / ke2
        b = eps * s - plasma + eps * mu - eps * kx**2 / ke2
        c = eps * kx**2 * s - mu * ke2 * (eps * s - plasma)
        root = mp.sqrt(b * b - 4 * a * c)
        squares = [(-b + root) / (2 * a), (-b - root) / (2 * a)]
        currents = [-plasma / (eps * (s - x / ke2) - plasma) for x in squares]
        even, odd = (_parity(squares, currents, thickness / 2, eps * kz0, is_odd) for is_odd in (False, True))
        return complex((even + odd) / 2), complex((even - odd) / 2)


def _parity(squares: list[Any], currents: list[Any], half: Any, eps_kz0: Any, is_odd: bool) -> Any:
    """Reflection of one parity; each mode cos or sin(kz z) is scaled to hy = 1 at the face z = half."""
    slopes = []
    for square in squares:
        kz = mp.sqrt(square)
        tangent = mp.tan(kz * half)
        slopes.append(kz / tangent if is_odd else -kz * tangent)
    first, second = currents[1], -currents[0]  # currents cancel at the face
    q = (first * slopes[0] + second * slopes[1]) / (-1j * eps_kz0 * (first + second))
    return (1 - q) / (1 + q)
