"""r and t by batched numpy: what `points_per_second` compares slabsim with.

One scaled 2x2 port after another, back to front, is applied to blocks of points that stay in the second-level cache.
State of a polarization: tangential fields a, b and transmission t; the equations are those of the kernels. Digits are
lost where the two modes of a wire layer coincide or a layer is thin, which slabsim takes care of.
"""

from typing import NamedTuple

import numpy as np

from slabsim.constants import C0, TWO_PI
from slabsim.engine.pack import wire_constants
from slabsim.stack.sample import Layer, Stack

BLOCK = 2048  # points of a block: the fastest of 256 to 20000 where it was tried


class Slab(NamedTuple):
    """One layer: arrays of shape (n_freqs, 1); `kp2` = (kp/k0)^2 is None without wires."""

    phase: np.ndarray  # i k0 d
    eps: np.ndarray
    inv_eps: np.ndarray
    kp2: np.ndarray | None = None
    x_wire: np.ndarray | None = None  # None: perfect conductor

    def rows(self, part: slice) -> "Slab":
        """The same at some of the frequencies."""
        return Slab(*(None if value is None else value[part] for value in self))


def slab(layer: Layer, frequencies: np.ndarray) -> Slab:
    """What a layer is at the frequencies [Hz]."""
    k0 = TWO_PI * frequencies / C0
    eps = layer.material.permittivity(frequencies)
    medium = [values[:, None] for values in (1j * k0 * layer.thickness, eps, 1.0 / eps)]
    if not layer.wires:
        return Slab(*medium)
    kp, zeta = wire_constants(layer, layer.wires[0], frequencies)
    kp2 = (kp / k0) ** 2
    if layer.wires[0].metal is None:
        return Slab(*medium, kp2[:, None])
    return Slab(*medium, kp2[:, None], (kp2 - 1j * eps * zeta * kp**2 / k0)[:, None])


def batched(stack: Stack, frequencies: np.ndarray, angles_deg: np.ndarray) -> tuple[np.ndarray, ...]:
    """r, t, R, T, A of open-ended wires along z in non-magnetic hosts; shapes (2, n_freqs, n_angles)."""
    s2 = np.sin(np.deg2rad(angles_deg)) ** 2
    slabs = [slab(layer, frequencies) for layer in reversed(stack.elements)]
    r = np.empty((2, frequencies.size, angles_deg.size), dtype=complex)
    t = np.empty_like(r)
    n_rows = max(1, BLOCK // angles_deg.size)
    for start in range(0, frequencies.size, n_rows):
        part = slice(start, start + n_rows)
        r[:, part], t[:, part] = cascade([one.rows(part) for one in slabs], s2)
    R, T = (x.real**2 + x.imag**2 for x in (r, t))
    return r, t, R, T, 1.0 - R - T


def cascade(slabs: list[Slab], s2: np.ndarray) -> tuple[list[np.ndarray], list[np.ndarray]]:
    """r and t of TE and TM of a stack in vacuum, slabs back to front."""
    z = np.sqrt(1.0 - s2)
    te = tm = (1.0, z, 1.0)
    for one in slabs:
        k2 = one.eps - s2
        p, c, g = wave(k2, one.phase)
        gk = g * k2
        te = advance(te, c, g, gk, p)
        if one.kp2 is None:
            tm = advance(tm, c, one.eps * g, one.inv_eps * gk, p)
        else:
            tm = advance(tm, *(ideal_wires if one.x_wire is None else lossy_wires)(one, s2, k2))
    scales = [1.0 / (z * a + b) for a, b, _ in (te, tm)]
    r = [(z * a - b) * scale for (a, b, _), scale in zip((te, tm), scales, strict=True)]
    return r, [2.0 * z * t * scale for (_, _, t), scale in zip((te, tm), scales, strict=True)]


def wave(k2: np.ndarray, phase: np.ndarray) -> tuple[np.ndarray, ...]:
    """p = exp(i kappa d), c = (1 + p^2)/2, g = (1 - p^2)/(2 kappa)."""
    kappa = np.sqrt(k2)
    p = np.exp(kappa * phase)
    half = 0.5 * p * p
    return p, 0.5 + half, (0.5 - half) / kappa


def advance(state: tuple, diagonal, upper, lower, factor) -> tuple[np.ndarray, ...]:
    """State (a, b, t) in front of a layer: tangential fields, transmission; its port has equal diagonal entries."""
    a, b, t = state
    return diagonal * a + upper * b, lower * a + diagonal * b, factor * t


def lossy_wires(one: Slab, s2: np.ndarray, k2: np.ndarray) -> tuple[np.ndarray, ...]:
    """TM port from the eigenvalues of Q = [[eps - s^2, s kp], [s kp, eps - X]]."""
    diff, c2 = one.x_wire - s2, s2 * one.kp2
    gap = np.sqrt(diff * diff + 4.0 * c2)
    inv_gap = 1.0 / gap
    mean = k2 - 0.5 * diff
    p1, c1, g1 = wave(mean + 0.5 * gap, one.phase)
    p2, cb, g2 = wave(mean - 0.5 * gap, one.phase)
    first = 0.5 + 0.5 * diff * inv_gap
    g2_first, g1_second, d = first * g2, g1 - first * g1, g1 * g2
    coupling = 2.0 * c2 * (c1 * cb - p1 * p2 - mean * d) * (inv_gap * inv_gap)
    lower = one.inv_eps * (k2 * d + coupling)
    return c1 * g2_first + cb * g1_second, one.eps * d, lower, p1 * g2_first + p2 * g1_second


def ideal_wires(one: Slab, s2: np.ndarray, k2: np.ndarray) -> tuple[np.ndarray, ...]:
    """The same without loss in the wires: eigenvalues eps, the TEM mode, and eps - kp^2 - s^2."""
    p1, c1, g1 = wave(one.eps, one.phase)  # frequency only
    l2 = k2 - one.kp2
    p2, cb, g2 = wave(l2, one.phase)
    first = one.kp2 / (one.kp2 + s2)
    second = 1.0 - first
    g2_first, g1_second, d = first * g2, second * g1, g1 * g2
    coupling = (2.0 * first * second) * (c1 * cb - p1 * p2)
    lower = one.inv_eps * ((first * first * one.eps + second * second * l2) * d + coupling)
    return c1 * g2_first + cb * g1_second, one.eps * d, lower, p1 * g2_first + p2 * g1_second
