"""Stacks of wire layers whose polarizations mix, by eigen-solutions of 6 x 6 matrices, batched in numpy.

What one would write without slabsim: numpy.linalg.eig over all points of a block, modes sorted into forward and
backward ones, a scattering matrix from them that holds decaying exponentials only, and the layers put together from
the back. The entries of the matrices come from slabsim; the two sides solve the same problem.
"""

from __future__ import annotations

import numpy as np

from slabsim.constants import C0, TWO_PI
from slabsim.engine import port_rows as rows
from slabsim.engine.generators import layer_generator
from slabsim.engine.response import squares
from slabsim.stack.sample import Layer, Stack

BLOCK = 512  # points whose matrices fit the cache


def batched_eigen(stack: Stack, frequencies: np.ndarray, angles_deg: np.ndarray, azimuth_deg: float) -> np.ndarray:
    """t of layers with one set of wires with open ends each, in vacuum: shape (2, 2, n_freqs, n_angles), into, out."""
    azimuth, one = np.deg2rad(azimuth_deg), np.ones(frequencies.size)
    layers = [e for e in stack.flatten() if isinstance(e, Layer)]
    parts = [_blocks(layer, frequencies, one, azimuth) for layer in layers]
    k0d = [TWO_PI * frequencies / C0 * layer.thickness for layer in layers]
    sin2, cos2 = (np.tile(values, frequencies.size) for values in squares(angles_deg))
    f = np.repeat(np.arange(frequencies.size), angles_deg.size)
    t = np.empty((2, 2, f.size), dtype=complex)
    for start in range(0, f.size, BLOCK):
        b = slice(start, start + BLOCK)
        t[:, :, b] = _solve(parts, k0d, f[b], np.sqrt(sin2[b]), cos2[b])
    return t.reshape(2, 2, frequencies.size, angles_deg.size)


def _blocks(layer: Layer, frequencies: np.ndarray, index2: np.ndarray, azimuth: float) -> np.ndarray:
    """Coefficients of 1, s and q^2 of the 6 x 6 generator, shape (3, n_freqs, 6, 6)."""
    found = layer_generator(layer, False, frequencies, index2, azimuth, lambda _: None)
    n = found.n_ports
    blocks = np.zeros((3, 3, n * n, frequencies.size), dtype=complex)
    for block, entry, multiplier, values in found.terms:
        blocks[multiplier, block, entry] += values
    a, b, d = (np.moveaxis(blocks[:, k].reshape(3, n, n, -1), 3, 1) for k in (rows.BLOCK_A, rows.BLOCK_B, rows.BLOCK_D))
    return np.concatenate([np.concatenate([d, a], 3), np.concatenate([b, d.swapaxes(2, 3)], 3)], 2)


def _solve(parts: list, k0d: list, f: np.ndarray, s: np.ndarray, q2: np.ndarray) -> np.ndarray:
    q = np.sqrt(q2)
    g = np.zeros((f.size, 2, 2), dtype=complex)
    g[:, 0, 0], g[:, 1, 1] = (q - 1) / (q + 1), (1 - q) / (1 + q)
    h = np.zeros_like(g)
    h[:, 0, 0] = h[:, 1, 1] = 2 / (1 + q)
    for coefficients, depth in zip(reversed(parts), reversed(k0d), strict=True):
        matrix = coefficients[0][f] + coefficients[1][f] * s[:, None, None] + coefficients[2][f] * q2[:, None, None]
        g, h = _fold(*_scattering(matrix, depth[f]), g, h)
    one = np.eye(2)
    v, i = one + g, one - g
    system = np.stack([v[:, 0] + q[:, None] * i[:, 0], q[:, None] * v[:, 1] + i[:, 1]], 1)
    a = np.linalg.solve(system, 2 * q[:, None, None] * one)
    t = h @ a  # rows: leaving as TM (h.s), TE; columns: driven by TM, TE
    return np.array([[t[:, 1, 1], t[:, 0, 1]], [t[:, 1, 0], t[:, 0, 0]]])


def _scattering(matrix: np.ndarray, depth: np.ndarray) -> tuple[np.ndarray, ...]:
    n = matrix.shape[1] // 2
    kappa, modes = np.linalg.eig(matrix)
    power = 2 * np.real(np.sum(modes[:, :n] * np.conj(modes[:, n:]), 1))
    forward = np.where(abs(kappa.imag) > 1e-9 * abs(kappa), kappa.imag, power)
    order = np.argsort(-forward, axis=1)
    kappa, modes = np.take_along_axis(kappa, order, 1), np.take_along_axis(modes, order[:, None, :], 2)
    there = np.exp(1j * kappa[:, :n] * depth[:, None])
    back = np.exp(-1j * kappa[:, n:] * depth[:, None])
    up, down = 0.5 * (modes[:, :n] + modes[:, n:]), 0.5 * (modes[:, :n] - modes[:, n:])
    ahead, behind = there[:, None, :], back[:, None, :]
    left = np.concatenate([up[:, :, :n], up[:, :, n:] * behind], 2)
    right = np.concatenate([down[:, :, :n] * ahead, down[:, :, n:]], 2)
    leaving = np.concatenate(
        [
            np.concatenate([down[:, :, :n], down[:, :, n:] * behind], 2),
            np.concatenate([up[:, :, :n] * ahead, up[:, :, n:]], 2),
        ],
        1,
    )
    entering = np.concatenate([left, right], 1)
    s = np.linalg.solve(entering.swapaxes(1, 2), leaving.swapaxes(1, 2)).swapaxes(1, 2)
    return s[:, :n, :n], s[:, n:, :n], s[:, n:, n:], s[:, :n, n:]


def _fold(r: np.ndarray, t: np.ndarray, r_back: np.ndarray, t_back: np.ndarray, g: np.ndarray, h: np.ndarray) -> tuple:
    wide = np.zeros_like(r)
    wide[:, :2, :2], wide[:, 2, 2] = g, 1.0  # open ends
    onward = np.linalg.solve(np.eye(3) - r_back @ wide, t)
    g, h = r + t_back @ wide @ onward, h @ onward[:, :2]
    own = g[:, 2:, :] / (1 - g[:, 2:, 2:])
    return g[:, :2, :2] + g[:, :2, 2:] * own[:, :, :2], h[:, :, :2] + h[:, :, 2:] * own[:, :, :2]
