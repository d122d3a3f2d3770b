"""Nodes and weights for sums over very many diffraction orders or modes."""

from __future__ import annotations

import numpy as np

_SINGLY = 16  # terms taken one by one
_NODES = 12  # of each block beyond; exact for polynomials of degree 23


def order_rule(last: float) -> tuple[np.ndarray, np.ndarray]:
    """Nodes and weights with sum_{m=1}^{M} f(m) = sum(weights f(nodes)), for some M >= `last`.

    Parameters
    ----------
    last : float
        How far to go at least.

    Returns
    -------
    nodes, weights : float arrays, shape (n,)
        n grows as log(last). M is the sum of the weights; the nodes beyond the first 16 are no whole numbers.

    Notes
    -----
    Blocks 17 ... 32, 33 ... 64 and so on, each as long as all before it. In a block the rule is that of Gauss for the
    sum over N equidistant points, from the recurrence of the discrete Chebyshev (Gram) polynomials,
    beta_n = n^2 (N^2 - n^2)/(4 (4 n^2 - 1)), by the method of Golub and Welsch (both from memory). A sequence whose
    nearest singularity is at m = 0, or as far from the real axis as m, comes out to 1e-14.
    """
    first = np.arange(1.0, max(1, min(_SINGLY, int(np.ceil(last)))) + 1.0)
    nodes, weights, count = [first], [np.ones(first.size)], _SINGLY
    while count < last:
        offsets, shares = _block(count)
        nodes.append(count + 0.5 * (count + 1.0) + offsets)
        weights.append(count * shares)
        count *= 2
    return np.concatenate(nodes), np.concatenate(weights)


def _block(count: int) -> tuple[np.ndarray, np.ndarray]:
    """Nodes from the middle of `count` equidistant points, and weights of sum 1."""
    from scipy.linalg import eigh_tridiagonal

    n = np.arange(1.0, _NODES)
    beta = n**2 * (float(count) ** 2 - n**2) / (4.0 * (4.0 * n**2 - 1.0))
    nodes, vectors = eigh_tridiagonal(np.zeros(_NODES), np.sqrt(beta))
    return nodes, vectors[0] ** 2
