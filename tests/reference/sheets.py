"""Admittances y = eta0 Y of sheets without thickness, as the reference solver takes them.

Square patches and square grids of strips: averaged conditions of Luukkonen et al., IEEE Trans. Antennas
Propag. 56, 1624 (2008) (cited from memory), in exp(-i w t), for periods well below the wavelength.
"""

from __future__ import annotations

from typing import Any

import mpmath as mp

from tests.reference.lattice import ETA0
from tests.reference.layers import Number, Sheet


def patches(k0: Number, sin_air: Number, period: Number, gap: Number, eps_before: Number, eps_after: Number) -> Sheet:
    """Square patches of `period` and `gap` [m] between two hosts; `sin_air` is |kt| / k0."""
    alpha, mean_eps, oblique = _grid(k0, sin_air, period, gap, eps_before, eps_after)
    z_tm = 1j / (2 * alpha * mp.sqrt(mean_eps))  # Z / eta0
    z_te = z_tm / oblique
    return Sheet(1 / z_te, 1 / z_tm)


def strips(k0: Number, sin_air: Number, period: Number, width: Number, eps_before: Number, eps_after: Number) -> Sheet:
    """Square grid of strips of `period` and strip `width` [m]; `sin_air` is |kt| / k0."""
    alpha, mean_eps, oblique = _grid(k0, sin_air, period, width, eps_before, eps_after)
    z_te = -1j * alpha / (2 * mp.sqrt(mean_eps))
    z_tm = z_te * oblique
    return Sheet(1 / z_te, 1 / z_tm)


def _grid(
    k0: Number, sin_air: Number, period: Number, slot: Number, eps_before: Number, eps_after: Number
) -> tuple[Any, Any, Any]:
    """Grid parameter alpha, mean permittivity, and 1 - (k0 / k_eff)^2 sin^2 / 2."""
    k0, period, slot = mp.mpmathify(k0), mp.mpmathify(period), mp.mpmathify(slot)
    mean_eps = (mp.mpmathify(eps_before) + mp.mpmathify(eps_after)) / 2
    k_eff = k0 * mp.sqrt(mean_eps)
    alpha = k_eff * period / mp.pi * mp.log(1 / mp.sin(mp.pi * slot / (2 * period)))
    return alpha, mean_eps, 1 - (k0 / k_eff) ** 2 * mp.mpmathify(sin_air) ** 2 / 2


def resistive_film(sheet_resistance: Number) -> Sheet:
    """Film of `sheet_resistance` [ohm]."""
    y = ETA0 / mp.mpmathify(sheet_resistance)
    return Sheet(y, y)


def metal_film(conductivity: Number, thickness: Number) -> Sheet:
    """Film of complex `conductivity` [S/m], much thinner than its skin depth, `thickness` [m]."""
    y = mp.mpmathify(conductivity) * mp.mpmathify(thickness) * ETA0
    return Sheet(y, y)
