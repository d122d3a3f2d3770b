"""Impedance of a plane of thin parallel wires, by two routes that do not share their sums.

In one medium: the field of all other wires on one of them, a sum of Hankel functions over the wires. Between two
media: a sum over the diffraction orders, term by term far out, with Richardson's extrapolation of what is left.
Impedances over eta0; E.n = z J for the zero order, J the mean current density.
"""

from __future__ import annotations

import math

import mpmath as mp
import numpy as np


def hankel_grid(pitch: float, radius: float, k0: float, along: float, across: float, eps: float, mu: float = 1.0):
    """z in a homogeneous lossless medium; kx/k0 along and ky/k0 across the wires.

    A current I exp(i kx x) radiates E_x = -(k_t^2 eta/(4 k)) I H0(k_t rho), k_t^2 = k^2 - kx^2 (textbook); the mean of
    its own field over the surface of a thin wire is 1 + (2i/pi) (ln(k_t r/2) + gamma).
    """
    k = k0 * math.sqrt(eps * mu)
    kt = mp.sqrt(k**2 - (along * k0) ** 2)
    ky = across * k0
    own = 1 + 2j / mp.pi * (mp.log(kt * radius / 2) + mp.euler)
    others = mp.mpc(0)
    for phase in (ky, -ky):  # terms exp(i n (kt + ky) a) n^(-1/2): Abel's mean by a small loss, extrapolated to none
        others += _abel(lambda loss, phase=phase: _damped(kt, phase, pitch, loss))
    kernel = (own + others) * kt**2 * mp.sqrt(mu / eps) / (4 * k)
    kz = mp.sqrt(kt**2 - ky**2)
    zero_order = mp.sqrt(mu / eps) * kt**2 / (2 * k * kz)
    return complex(kernel * pitch - zero_order)


def _damped(kt, phase, pitch, loss):
    """Sum over n >= 1 of H0(kt n a) exp(i phase n a) exp(-loss n)."""
    n = np.arange(1, int(45 / loss))
    from scipy.special import hankel1

    return mp.mpmathify(
        complex(np.sum(hankel1(0, float(kt) * n * pitch) * np.exp((1j * float(phase) * pitch - loss) * n)))
    )


def _abel(value):
    """Limit of an analytic function of the loss at zero, from polynomials through equally spaced losses."""
    table = [value(0.004 * (j + 1)) for j in range(8)]
    for order in range(1, 8):
        table = [(table[j] * (j + 1 + order) - table[j + 1] * (j + 1)) / order for j in range(len(table) - 1)]
    return table[0]


def spectral_grid(pitch, radius, k0, along, across, eps, mu=(1.0, 1.0), terms=20000):
    """z between two media; `eps`, `mu` pairs of numbers, complex ones too."""
    sums = [_partial(pitch, k0, along, across, eps, mu, n) for n in (terms, 2 * terms)]
    far = -1j * (1 / (1 / mu[0] + 1 / mu[1]) - along**2 / (eps[0] + eps[1]))
    return (4 * sums[1] - sums[0]) / 3 + far * 2 * math.log(pitch / (2 * math.pi * radius)) * k0 * pitch / (2 * math.pi)


def _partial(pitch, k0, along, across, eps, mu, terms):
    m = np.arange(1, terms + 1)
    step = 2 * np.pi / (k0 * pitch)
    far = -1j * (1 / (1 / mu[0] + 1 / mu[1]) - along**2 / (eps[0] + eps[1]))
    total = 0.0
    for p in (across + step * m, across - step * m):
        kt2 = along**2 + p**2
        kz = [_decaying(e * u - kt2) for e, u in zip(eps, mu, strict=True)]
        te = kz[0] / mu[0] + kz[1] / mu[1]
        tm = eps[0] / kz[0] + eps[1] / kz[1]
        total = total + np.sum(along**2 / (kt2 * tm) + p**2 / (kt2 * te) - far / (step * m))
    return total


def _decaying(square):
    root = np.sqrt(square + 0j)
    return np.where(root.imag < 0, -root, root)
