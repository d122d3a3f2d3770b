"""The edge of a semi-infinite set of metal plates by mode matching: a truncated linear system, in units of pi/b."""

import numpy as np


def mode_matching(u, v, field, n):
    """r outside, r of the first mode inside, and the product of both transmissions.

    Wavenumber u, wavenumber v across the plates, orders -n ... n outside and as many modes inside: twice as many per
    length as there are pairs of orders, which is what the fields at the edges ask for. The error falls as 1/n.
    """
    orders = v + 2 * np.arange(-n, n + 1)
    modes = np.arange(1, 2 * n + 2) if field == "along" else np.arange(0, 2 * n + 1)
    kz, kappa = _decaying(u**2 - orders**2), _decaying(u**2 - modes**2)
    overlap = _overlap(orders[:, None], modes[None, :], field)
    size, one = orders.size, np.eye(orders.size)
    incident = one[n]
    matrix = np.block([[one, -overlap], [np.diag(kz), overlap * kappa]])
    from_outside = np.linalg.solve(matrix, np.concatenate([-incident, kz * incident]))
    first = np.eye(modes.size)[0]
    matrix = np.block([[one, -overlap], [-np.diag(kz), -overlap * kappa]])
    from_inside = np.linalg.solve(matrix, np.concatenate([overlap @ first, -overlap @ (kappa * first)]))
    return np.array([from_outside[n], from_inside[size], from_outside[size] * from_inside[n]])


def _overlap(p, m, field):
    """Mean over 0 < y < pi of sin(m y) or cos(m y) times exp(-i p y)."""
    rising, falling = _mean(m - p), _mean(-m - p)
    return (rising - falling) / 2j if field == "along" else (rising + falling) / 2


def _mean(q):
    """Mean of exp(i q y) over 0 < y < pi."""
    q = q + 0j
    safe = np.where(abs(q) < 1e-14, 1.0, q)
    return np.where(abs(q) < 1e-14, 1.0, (np.exp(1j * safe * np.pi) - 1) / (1j * safe * np.pi))


def _decaying(square):
    root = np.sqrt(square + 0j)
    return np.where(root.imag < 0, -root, root)
