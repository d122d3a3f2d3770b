"""What a lattice of round wires is to the state equations: kp, zeta and the local permittivity.

SI units, exp(-i w t). All results are mpmath numbers in the current working precision.
"""

from __future__ import annotations

from typing import Any

import mpmath as mp

from tests.reference.layers import Number

C0 = 299_792_458
ETA0 = mp.mpf("1.25663706212e-6") * C0  # vacuum permeability of CODATA 2018 times c [ohm]


def lattice_constant(ratio: Number) -> Any:
    """F(p/q) = -ln(u)/2 + sum_{n>=1} [coth(pi n u) - 1]/n + pi u/6 of a rectangular lattice."""
    u = mp.mpmathify(ratio)
    tail = mp.nsum(lambda n: 2 / (n * mp.expm1(2 * mp.pi * n * u)), [1, mp.inf])  # coth(x) - 1 = 2/(e^2x - 1)
    return -mp.log(u) / 2 + tail + mp.pi * u / 6


def kp_lattice(p: Number, q: Number, radius: Number) -> Any:
    """kp [1/m] of thin wires of `radius` in a rectangular cell `p` by `q` [m]: lattice sum."""
    p, q, radius = mp.mpmathify(p), mp.mpmathify(q), mp.mpmathify(radius)
    s = mp.sqrt(p * q)
    return mp.sqrt(2 * mp.pi / s**2 / (mp.log(s / (2 * mp.pi * radius)) + lattice_constant(p / q)))


def kp_logarithmic(pitch: Number, radius: Number) -> Any:
    """kp [1/m] of a square lattice, logarithmic estimate."""
    a, radius = mp.mpmathify(pitch), mp.mpmathify(radius)
    return mp.sqrt(2 * mp.pi / (a**2 * mp.log(a / radius)))


def kp_gap(pitch: Number, radius: Number) -> Any:
    """kp [1/m] of a square lattice, from the flux through the gap between neighbouring wires."""
    a, radius = mp.mpmathify(pitch), mp.mpmathify(radius)
    return mp.sqrt(2 * mp.pi / (a**2 * mp.log(a**2 / (4 * radius * (a - radius)))))


def eps_of_conductor(conductivity: Number, k0: Number) -> Any:
    """Relative permittivity of a metal of DC `conductivity` [S/m]."""
    return 1 + 1j * mp.mpmathify(conductivity) * ETA0 / mp.mpmathify(k0)


def round_wire_impedance(eps_metal: Number, radius: Number, k0: Number, eps_host: Number = 1) -> Any:
    """Zw [ohm/m] of a round wire with skin effect: km J0(km r) / (2 pi r sigma J1(km r)).

    `eps_host`: as in `thin_wire_impedance`.
    """
    eps_metal, radius, k0 = mp.mpmathify(eps_metal), mp.mpmathify(radius), mp.mpmathify(k0)
    sigma = -1j * k0 / ETA0 * (eps_metal - mp.mpmathify(eps_host))
    km = k0 * mp.sqrt(eps_metal)
    x = km * radius
    return km * mp.besselj(0, x) / (2 * mp.pi * radius * sigma * mp.besselj(1, x))


def thin_wire_impedance(eps_metal: Number, radius: Number, k0: Number, eps_host: Number = 1) -> Any:
    """Zw [ohm/m] of a wire thinner than its skin depth: 1/(sigma pi r^2).

    `eps_host` = 1 counts all the metal's current, as the skin-effect form does; the host's permittivity
    counts the current beyond the host's own and reproduces the published finite-conductivity eps_zz.
    """
    sigma = -1j * mp.mpmathify(k0) / ETA0 * (mp.mpmathify(eps_metal) - mp.mpmathify(eps_host))
    return 1 / (sigma * mp.pi * mp.mpmathify(radius) ** 2)


def zeta(impedance: Number, cell_area: Number) -> Any:
    """Zw A / eta0 [m] of a wire of internal `impedance` [ohm/m] in a cell of `cell_area` [m^2]."""
    return mp.mpmathify(impedance) * mp.mpmathify(cell_area) / ETA0


def local_eps_zz(eps_host: Number, kp: Number, zeta_of_wire: Number, k0: Number) -> Any:
    """Permittivity along the wires in the local model, w = Ez / xi."""
    k0 = mp.mpmathify(k0)
    xi = mp.mpmathify(zeta_of_wire) - 1j * k0 / mp.mpmathify(kp) ** 2
    return mp.mpmathify(eps_host) + 1j / (k0 * xi)
