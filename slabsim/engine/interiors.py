"""Fields inside a layer, and the power that the metal of each set of its wires takes.

The layer is halved again and again until its slices are thin. Going down, the waves that enter a piece from both sides
fix those at its middle plane; at the end each thin slice is integrated by Gauss-Legendre quadrature. All steps are
bounded, however deep the layer decays.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from slabsim.constants import C0, TWO_PI
from slabsim.engine.generators import local_tensor, turned
from slabsim.engine.wire_numbers import WireNumbers, direction_of, wire_numbers
from slabsim.stack.sample import Layer, Mesh, Model, WireSet

_THIN = 0.5  # norm of the generator times the thickness of a slice
_NODES = 6


@dataclass(frozen=True)
class Interior:
    """A layer at one point of a sweep, lengths over 1/k0.

    Attributes
    ----------
    blocks : tuple of complex arrays, shape (n, n)
        A, B, D of its generator, scaled by `y`.
    depth : float
    behind : complex array
        G of all that lies behind.
    continues, is_kept : tuple of int, of bool
        For each port beyond 2: the port behind in which it goes on, or -1; whether it goes on in front.
    rho_back, rho_front : tuple of complex
        What the others end on.
    front : complex array
        Waves a in front; |a|^2 is in units of the incident flux.
    y : float
        Reference admittance.
    references : tuple of float
        Reference kp [rad/m] of the ports beyond 2.
    s, q2 : float
        kt/k0 and its complement to the index of the front medium.
    """

    blocks: tuple[np.ndarray, ...]
    depth: float
    behind: np.ndarray
    continues: tuple[int, ...]
    is_kept: tuple[bool, ...]
    rho_back: tuple[complex, ...]
    rho_front: tuple[complex, ...]
    front: np.ndarray
    y: float
    references: tuple[float, ...]
    s: float
    q2: float

    @property
    def n_ports(self) -> int:
        """Ports of the layer."""
        return self.blocks[0].shape[0]


def metal_losses(interior: Interior, layer: Layer, model: Model, frequency: float, azimuth_deg: float) -> list[float]:
    """Share of the incident power lost in the metal of each set of wires, and of the mesh if there is one.

    Parameters
    ----------
    interior : Interior
    layer : Layer
    model : {"nonlocal", "local"}
    frequency : float
        [Hz].
    azimuth_deg : float
        Of the plane of incidence [degrees].
    """
    f = np.array([frequency])
    sets: list[WireSet | Mesh] = [*layer.wires, *([] if layer.mesh is None else [layer.mesh])]
    numbers = [wire_numbers(layer, wires, f) for wires in sets]
    if all(one.zeta[0].real == 0.0 for one in numbers):
        return [0.0] * len(sets)
    k0, azimuth = TWO_PI * frequency / C0, float(np.deg2rad(azimuth_deg))
    forms = (_local_forms if model == "local" else _forms)(interior, layer, sets, numbers, f, azimuth)
    weights, fields = _inside(interior)
    unscaled = fields * np.repeat([interior.y**-0.5, interior.y**0.5], interior.n_ports)
    found = []
    for one, form in zip(numbers, forms, strict=True):
        squared = (abs(unscaled @ form.T) ** 2).sum(axis=1)
        found.append(float(one.zeta[0].real * (weights @ squared)) / k0)
    return found


def _forms(
    interior: Interior,
    layer: Layer,
    sets: list[WireSet | Mesh],
    numbers: list[WireNumbers],
    f: np.ndarray,
    azimuth: float,
) -> list[np.ndarray]:
    """Currents w of each set as linear forms of (v, i): arrays of shape (1 or 3, 2 n)."""
    n, k0 = interior.n_ports, TWO_PI * float(f[0]) / C0
    port, found = 2, []
    for wires, one in zip(sets, numbers, strict=True):
        direction = turned(direction_of(wires), layer.rotation, azimuth)
        form = np.zeros((3, 2 * n), dtype=complex)
        if direction[2] > 0.0:
            form[0, n + port] = interior.references[port - 2] / direction[2]
            if isinstance(wires, Mesh):  # w = (E - grad phi)/xi of the wires along p and s
                strength = k0 * one.local[0]
                form[1, 0], form[2, 1] = strength, strength
                form[1, port] = strength * interior.s * k0 / interior.references[port - 2]
            port += 1
        else:
            slope = direction[0] ** 2 / one.charge[0]
            front_index2 = interior.s**2 + interior.q2
            nonlocal_part = one.inductance[0] + one.zc[0] - slope * front_index2 + slope * interior.q2
            form[0, :2] = -k0 * one.kappa_p[0] ** 2 / nonlocal_part * np.array(direction[:2])
        found.append(form)
    return found


def _local_forms(
    interior: Interior,
    layer: Layer,
    sets: list[WireSet | Mesh],
    numbers: list[WireNumbers],
    f: np.ndarray,
    azimuth: float,
) -> list[np.ndarray]:
    """The same in the local model: w = n.E/xi, Ez from Maxwell's equations."""
    k0 = TWO_PI * float(f[0]) / C0
    eps = local_tensor(layer, f, azimuth)[:, :, 0]
    e = np.zeros((3, 4), dtype=complex)
    e[0, 0] = e[1, 1] = 1.0
    e[2] = -np.array([eps[2, 0], eps[2, 1], interior.s, 0.0]) / eps[2, 2]
    found = []
    for wires, one in zip(sets, numbers, strict=True):
        n = np.eye(3) if isinstance(wires, Mesh) else np.array([turned(wires.direction, layer.rotation, azimuth)])
        found.append(k0 * one.local[0] * (n @ e))
    return found


def _inside(interior: Interior) -> tuple[np.ndarray, np.ndarray]:
    """Quadrature weights, and the fields (v, i) at the nodes, shape (n_nodes, 2 n)."""
    from scipy.linalg import expm

    a_block, b_block, d_block = interior.blocks
    generator = 1j * np.block([[d_block, a_block], [b_block, d_block.T]])
    size = float(np.linalg.norm(generator, 1)) * interior.depth
    n_levels = max(0, int(np.ceil(np.log2(max(size, 1e-300) / _THIN))))
    step = interior.depth / 2**n_levels
    pieces = [_scatter(expm(generator * step))]
    for _ in range(n_levels):
        pieces.append(_twice(pieces[-1]))
    left, right = (wave[None, :] for wave in _entering(interior, pieces[-1]))
    for half in reversed(pieces[:-1]):
        r, t, r_back, t_back = half
        one = np.eye(r.shape[0])
        middle = np.linalg.solve(one - r_back @ r, (left @ t.T + right @ (r_back @ t_back).T).T).T
        returned = middle @ r.T + right @ t_back.T
        left = np.stack([left, middle], axis=1).reshape(-1, r.shape[0])
        right = np.stack([returned, right], axis=1).reshape(-1, r.shape[0])
    r, _, _, t_back = pieces[0]
    reflected = left @ r.T + right @ t_back.T
    at_left = np.hstack([left + reflected, left - reflected])
    nodes, weights = np.polynomial.legendre.leggauss(_NODES)
    fields = [at_left @ expm(generator * step * 0.5 * (1.0 + node)).T for node in nodes]
    return np.repeat(0.5 * step * weights, at_left.shape[0]), np.concatenate(fields)


def _entering(interior: Interior, layer: tuple[np.ndarray, ...]) -> tuple[np.ndarray, np.ndarray]:
    """Waves that enter a layer in front and behind, the ports whose wires end at its faces among them."""
    r, t, r_back, t_back = layer
    n = r.shape[0]
    g = np.zeros((n, n), dtype=complex)
    place = [0, 1, *interior.continues]
    for i in range(n):
        if place[i] < 0:
            g[i, i] = interior.rho_back[i - 2]
            continue
        for j in range(n):
            if place[j] >= 0:
                g[i, j] = interior.behind[place[i], place[j]]
    onward = np.linalg.solve(np.eye(n) - r_back @ g, t)
    whole = r + t_back @ g @ onward
    own = [port for port in range(2, n) if not interior.is_kept[port - 2]]
    known = [port for port in range(n) if port not in own]
    a = np.zeros(n, dtype=complex)
    a[known] = interior.front
    rho = np.array([interior.rho_front[port - 2] for port in own])
    system = np.eye(len(own)) - rho[:, None] * whole[np.ix_(own, own)]
    a[own] = np.linalg.solve(system, rho * (whole[np.ix_(own, known)] @ a[known])) if own else []
    return a, g @ (onward @ a)


def _scatter(f: np.ndarray) -> tuple[np.ndarray, ...]:
    """R, T, R', T' of a slice from the fields behind it over those in front."""
    n = f.shape[0] // 2
    to_waves = np.block([[np.eye(n), np.eye(n)], [np.eye(n), -np.eye(n)]])
    w = 0.5 * to_waves @ f @ to_waves
    t_back = np.linalg.inv(w[n:, n:])
    r = -t_back @ w[n:, :n]
    return r, w[:n, :n] + w[:n, n:] @ r, w[:n, n:] @ t_back, t_back


def _twice(piece: tuple[np.ndarray, ...]) -> tuple[np.ndarray, ...]:
    r, t, r_back, t_back = piece
    one = np.eye(r.shape[0])
    there = np.linalg.solve(one - r_back @ r, t)
    back = np.linalg.solve(one - r @ r_back, t_back)
    return r + t_back @ r @ there, t @ there, r_back + t @ r_back @ back, t_back @ back
