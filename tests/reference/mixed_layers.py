"""Layers whose polarizations mix: what the reference is told of them, and their raw state equations.

In the frame of the sample, kx and ky both present, nothing eliminated but Ez, hz and what is algebraic. Lengths are
measured in 1/k0, so that a state is (Ex, Ey, hx, hy) and, for each set of wires that ends at the faces, (k0 phi, w/k0).
Every quantity is a row: a linear form in the state.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import mpmath as mp

from tests.reference.layers import End, Number, Open

Axes = tuple[Number, Number, Number]
_OPEN = Open()


@dataclass(frozen=True)
class Set:
    """Parallel wires along the unit vector `n` (axes of the layer), with their ends if n[2] > 0.

    `inductance` is the permeability that the field around the wires meets: xi = zeta - i k0 inductance/kp^2.
    """

    kp: Number
    n: Axes
    zeta: Number = 0
    front: End = _OPEN
    back: End = _OPEN
    inductance: Number = 1


@dataclass(frozen=True)
class MeshArray:
    """Three orthogonal sets joined at the nodes, in an isotropic host."""

    kp: Number
    stiffness: Number
    zeta: Number = 0
    front: End = _OPEN
    back: End = _OPEN
    inductance: Number = 1


@dataclass(frozen=True)
class MixedSlab:
    """A layer; `eps`, `mu` along its own axes, which `rotation` [rad] turns about z, the wires with them."""

    eps: Axes
    mu: Axes
    thickness: Number
    sets: tuple[Set, ...] = ()
    mesh: MeshArray | None = None
    rotation: Number = 0

    @property
    def ended(self) -> list[Set | MeshArray]:
        """Wires that end at the faces, in the order of their pairs in the state."""
        sets: list[Set | MeshArray] = [one for one in self.sets if one.n[2] > 0]
        return sets if self.mesh is None else [*sets, self.mesh]


@dataclass(frozen=True)
class TensorSheet:
    """A sheet of zero thickness, J = y E_t with a symmetric 2x2 admittance (xx, xy, yy)."""

    y: tuple[Number, Number, Number]


def mixed_generator(slab: MixedSlab, k0: Any, kx: Any, ky: Any, model: str) -> Any:
    """Matrix of d(state)/d(k0 z), from Maxwell's equations and the wire equations; kx, ky over k0."""
    ended = slab.ended if model == "nonlocal" else []
    size = 4 + 2 * len(ended)

    def unit(index: int) -> Any:
        row = mp.matrix(1, size)
        row[index] = 1
        return row

    ex, ey, hx, hy = (unit(i) for i in range(4))
    nothing = mp.matrix(1, size)
    (exx, exy, eyy), ez_value = _transverse(slab.eps, slab.rotation), mp.mpmathify(slab.eps[2])
    (mxx, mxy, myy), mz_value = _transverse(slab.mu, slab.rotation), mp.mpmathify(slab.mu[2])
    pairs = {id(one): (unit(4 + 2 * k), unit(5 + 2 * k)) for k, one in enumerate(ended)}
    directions = [(one, _turned(one.n, slab.rotation)) for one in slab.sets]

    # i kx hy - i ky hx = -i eps_z Ez + Jz
    curl, conductance, jz = 1j * kx * hy - 1j * ky * hx, -1j * ez_value, nothing
    if model == "local":
        for one, n in directions:
            conductance += n[2] ** 2 / _xi(one, k0)
            jz = jz + (n[2] / _xi(one, k0)) * (n[0] * ex + n[1] * ey)
        if slab.mesh is not None:
            conductance += 1 / _xi(slab.mesh, k0)
    else:
        for one, n in directions:
            if id(one) in pairs:
                jz = jz + n[2] * pairs[id(one)][1]
        if slab.mesh is not None:
            jz = jz + pairs[id(slab.mesh)][1]
    ez = (curl - jz) / conductance
    hz = (kx * ey - ky * ex) / mz_value

    jx, jy, rows = nothing, nothing, {}
    for one, n in directions:
        along, xi, kn = n[0] * ex + n[1] * ey + n[2] * ez, _xi(one, k0), kx * n[0] + ky * n[1]
        charge = 1j * _charge(slab.eps, one.n) * (mp.mpmathify(one.kp) / k0) ** 2
        if model == "local":
            w = along / xi
        elif id(one) in pairs:
            phi, w = pairs[id(one)]
            rows[id(one)] = ((along - xi * w - 1j * kn * phi) / n[2], (charge * phi - 1j * kn * w) / n[2])
        else:
            w = along / (xi - kn**2 / charge)
        jx, jy = jx + n[0] * w, jy + n[1] * w
    if slab.mesh is not None:
        xi, factor = _xi(slab.mesh, k0), 1j * ez_value * mp.mpmathify(slab.mesh.stiffness)
        if model == "local":
            wx, wy = ex / xi, ey / xi
        else:
            phi, wz = pairs[id(slab.mesh)]
            wx, wy = (ex - 1j * kx * phi) / xi, (ey - 1j * ky * phi) / xi
            charge = factor * (mp.mpmathify(slab.mesh.kp) / k0) ** 2
            rows[id(slab.mesh)] = (ez - xi * wz, charge * phi - 1j * kx * wx - 1j * ky * wy)
        jx, jy = jx + wx, jy + wy

    matrix = mp.matrix(size, size)
    matrix[0, :] = 1j * kx * ez + 1j * (mxy * hx + myy * hy)
    matrix[1, :] = 1j * ky * ez - 1j * (mxx * hx + mxy * hy)
    matrix[2, :] = 1j * kx * hz - 1j * (exy * ex + eyy * ey) + jy
    matrix[3, :] = 1j * ky * hz + 1j * (exx * ex + exy * ey) - jx
    for k, one in enumerate(ended):
        matrix[4 + 2 * k, :], matrix[5 + 2 * k, :] = rows[id(one)]
    return matrix


def flux_weights(slab: MixedSlab) -> list[Any]:
    """n_z of each pair (phi, w) of the state."""
    return [mp.mpf(1) if isinstance(one, MeshArray) else mp.mpmathify(one.n[2]) for one in slab.ended]


def _xi(wires: Set | MeshArray, k0: Any) -> Any:
    return mp.mpmathify(wires.zeta) * k0 - 1j * mp.mpmathify(wires.inductance) * (k0 / mp.mpmathify(wires.kp)) ** 2


def _charge(eps: Axes, n: Axes) -> Any:
    """Geometric mean of the permittivity over the plane across n: sqrt(n . cof(eps) . n)."""
    return mean_across(eps, n)


def mean_across(values: Axes, n: Axes) -> Any:
    """Root of the product of the two eigenvalues of a diagonal tensor in the plane across n, each root by itself."""
    x, y, z = (mp.mpmathify(one) for one in values)
    if x == y == z:
        return x
    a, b, c = (mp.mpmathify(one) for one in n)
    trace = x + y + z - (a**2 * x + b**2 * y + c**2 * z)
    determinant = a**2 * y * z + b**2 * x * z + c**2 * x * y
    half = mp.sqrt(trace**2 / 4 - determinant)
    roots = [mp.sqrt(trace / 2 + half), mp.sqrt(trace / 2 - half)]
    # a lossless eigenvalue may have an imaginary part of rounding: n is a unit vector in double precision only
    return mp.fprod(-root if mp.im(root) < -1e-12 * abs(root) else root for root in roots)


def _transverse(values: Axes, rotation: Number) -> tuple[Any, Any, Any]:
    c, s = mp.cos(mp.mpmathify(rotation)), mp.sin(mp.mpmathify(rotation))
    x, y = mp.mpmathify(values[0]), mp.mpmathify(values[1])
    return x * c**2 + y * s**2, (x - y) * c * s, x * s**2 + y * c**2


def _turned(n: Axes, rotation: Number) -> tuple[Any, Any, Any]:
    c, s = mp.cos(mp.mpmathify(rotation)), mp.sin(mp.mpmathify(rotation))
    a, b, z = (mp.mpmathify(one) for one in n)
    return a * c - b * s, a * s + b * c, z
