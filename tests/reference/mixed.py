"""Jones matrices of a stack whose polarizations mix, by brute force: the reference for the four-port engine.

As `dense.py`: the matrix exponential of every layer's raw generator, all conditions in one dense linear system, in as
many digits as the growth in the layers asks for. The frame is that of the sample; the plane of incidence stands at the
azimuth phi in it.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import mpmath as mp

from tests.reference.layers import Grounded, HalfSpace, Joined, Number, Open, digits_of_growth
from tests.reference.mixed_layers import MeshArray, MixedSlab, Set, TensorSheet, flux_weights, mixed_generator

__all__ = ["HalfSpace", "MeshArray", "MixedResponse", "MixedSlab", "Set", "TensorSheet", "solve_mixed"]

GUARD_DIGITS = 20
_POLARIZATIONS = ("TE", "TM")


@dataclass(frozen=True)
class MixedResponse:
    """What a stack does to a TE and to a TM wave; first index: incident TE, TM.

    Attributes
    ----------
    r, t : list of list of complex
        Second index: leaving as TE, TM. `t` is None behind a perfect conductor.
    R, T : list of list of float
    A : list of float
    absorbed : list of tuple of float
        Per element: flux in front minus flux behind, over the incident flux; loads at wire ends not included.
    end_loads : list of tuple of float
        Per element: lost in the loads given for both ends of its wires.
    """

    r: list[list[complex]]
    t: list[list[complex]] | None
    R: list[list[float]]
    T: list[list[float]] | None
    A: list[float]
    absorbed: list[tuple[float, ...]]
    end_loads: list[tuple[float, ...]]


def solve_mixed(
    front: HalfSpace,
    elements: Sequence[MixedSlab | TensorSheet],
    back: HalfSpace | str,
    k0: Number,
    theta: Number,
    phi: Number,
    model: str = "nonlocal",
    digits: int = 25,
) -> MixedResponse:
    """Response to plane waves at the polar angle `theta` and azimuth `phi` [rad]; else as `dense.solve`."""
    with mp.workdps(digits + GUARD_DIGITS):
        extra = _extra_digits(_System(front, elements, back, k0, theta, phi, model))
    with mp.workdps(digits + GUARD_DIGITS + extra):
        return _System(front, elements, back, k0, theta, phi, model).response()


def _extra_digits(system: _System) -> int:
    growths, spread = [0.0], 0.0
    for element, matrix in zip(system.elements, system.generators, strict=True):
        if matrix is not None:
            growths.append(digits_of_growth(matrix, system.k0 * mp.mpmathify(element.thickness)))
            spread = max(spread, float(mp.log10(mp.mnorm(matrix, 1))))
    return int(sum(growths) + max(growths) + 2 * spread) + 1


class _System:
    """Unknowns r_TE, r_TM, t_TE, t_TM, then the front states of all layers; equations are rows that vanish."""

    def __init__(self, front, elements, back, k0, theta, phi, model) -> None:
        self.k0, self.model = mp.mpmathify(k0), model
        self.front, self.elements = front, list(elements)
        self.back = None if isinstance(back, str) else back
        theta, phi = mp.mpmathify(theta), mp.mpmathify(phi)
        self.cos_theta = mp.cos(theta)
        self.kt = mp.sqrt(mp.mpmathify(front.eps).real) * mp.sqrt(mp.mpmathify(front.mu).real) * mp.sin(theta)
        self.k_hat, self.s_hat = (mp.cos(phi), mp.sin(phi)), (-mp.sin(phi), mp.cos(phi))
        kx, ky = self.kt * self.k_hat[0], self.kt * self.k_hat[1]
        self.generators = [
            mixed_generator(one, self.k0, kx, ky, model) if isinstance(one, MixedSlab) else None
            for one in self.elements
        ]
        self.size = 4 + sum(matrix.rows for matrix in self.generators if matrix is not None)

    def response(self) -> MixedResponse:
        equations, faces = self._equations()
        columns = self.size + 2  # the last two: incident TE, TM
        coefficients, sources = mp.matrix(len(equations), self.size), mp.matrix(len(equations), 2)
        for i, row in enumerate(equations):
            for j in range(self.size):
                coefficients[i, j] = row[j]
            sources[i, 0], sources[i, 1] = -row[columns - 2], -row[columns - 1]
        used = [j for j in range(self.size) if self.back is not None or j not in (2, 3)]
        reduced = mp.matrix(len(equations), len(used))
        for k, j in enumerate(used):
            reduced[:, k] = coefficients[:, j]
        found = []
        for p in range(2):
            solution = mp.lu_solve(reduced, sources[:, p])
            values = mp.matrix(columns, 1)
            for k, j in enumerate(used):
                values[j] = solution[k]
            values[self.size + p] = 1
            found.append(values)
        return self._collect(found, faces)

    def _equations(self):
        equations, faces = [], []
        fields, wires = self._front_rows(), []
        start = 4
        for element, matrix in zip(self.elements, self.generators, strict=True):
            if matrix is None:
                after = self._through(fields, element)
                faces.append(((fields, []), (after, []), element))
                fields = after
                continue
            states = mp.matrix(matrix.rows, self.size + 2)
            for i in range(matrix.rows):
                states[i, start + i] = 1
            start += matrix.rows
            behind = mp.expm(matrix * (self.k0 * mp.mpmathify(element.thickness))) * states
            front_face, back_face = self._face(states, element), self._face(behind, element)
            equations += [a - b for a, b in zip(front_face[0], fields, strict=True)]
            equations += self._ends(wires, front_face[1])
            faces.append((front_face, back_face, element))
            fields, wires = back_face
        equations += self._ends(wires, [])
        if self.back is None:
            return [*equations, fields[0], fields[1]], faces
        return equations + [a - b for a, b in zip(fields, self._back_rows(), strict=True)], faces

    def _face(self, states, element):
        """Fields (Ex, Ey, hx, hy), and (wires, phi, w) of each set that ends here."""
        ended = element.ended if self.model == "nonlocal" else []
        wires = [(one, states[4 + 2 * k, :], states[5 + 2 * k, :]) for k, one in enumerate(ended)]
        return [states[i, :] for i in range(4)], wires

    def _ends(self, before, after):
        """Conditions on the wires that meet at an interface, those of the layer before and of the layer after."""
        equations = []
        joined = [
            [one for one in side if isinstance(self._end(one, k), Joined)] for k, side in ((1, before), (0, after))
        ]
        for one, other in zip(*joined, strict=True):
            load = self._load(one, 1) + self._load(other, 0)
            equations += [other[2] - one[2], other[1] - one[1] + load * one[2]]
        for k, side in ((1, before), (0, after)):
            for one in side:
                end = self._end(one, k)
                if isinstance(end, Open):
                    equations.append(one[2])
                elif isinstance(end, Grounded):
                    equations.append(one[1] - (1 if k else -1) * self._load(one, k) * one[2])
        return equations

    @staticmethod
    def _end(one, side):
        return one[0].back if side else one[0].front

    def _load(self, one, side):
        return mp.mpmathify(getattr(self._end(one, side), "load", 0)) * self.k0**2

    def _through(self, fields, sheet):
        ex, ey, hx, hy = fields
        xx, xy, yy = (mp.mpmathify(value) for value in sheet.y)
        jx, jy = xx * ex + xy * ey, xy * ex + yy * ey
        return [ex, ey, hx + jy, hy - jx]  # z x (h_after - h_before) = J

    def _front_rows(self):
        eps, mu = mp.mpmathify(self.front.eps), mp.mpmathify(self.front.mu)
        kz = mp.sqrt(eps) * mp.sqrt(mu) * self.cos_theta
        total = [mp.matrix(1, self.size + 2) for _ in range(4)]
        for p in range(2):
            for column, sign in ((self.size + p, 1), (p, -1)):
                for i, value in enumerate(self._wave(eps, mu, sign * kz, p)):
                    total[i][column] += value
        return total

    def _back_rows(self):
        total = [mp.matrix(1, self.size + 2) for _ in range(4)]
        for p in range(2):
            for i, value in enumerate(self._back_wave(p)):
                total[i][2 + p] += value
        return total

    def _back_wave(self, p):
        eps, mu = mp.mpmathify(self.back.eps), mp.mpmathify(self.back.mu)
        kz = mp.sqrt(eps * mu - self.kt**2)
        if mp.im(kz) < 0 or (mp.im(kz) == 0 and mp.re(kz / (eps if p else mu)) < 0):
            kz = -kz
        return self._wave(eps, mu, kz, p)

    def _wave(self, eps, mu, kz, p):
        """(Ex, Ey, hx, hy) of a wave exp(i kz z): TE with E.s = 1, TM with h.s = sqrt(eps/mu)."""
        if p == 0:
            return (*self.s_hat, -kz / mu * self.k_hat[0], -kz / mu * self.k_hat[1])
        h = mp.sqrt(eps) / mp.sqrt(mu)
        return (kz * h / eps * self.k_hat[0], kz * h / eps * self.k_hat[1], h * self.s_hat[0], h * self.s_hat[1])

    def _collect(self, found, faces) -> MixedResponse:
        eps, mu = mp.mpmathify(self.front.eps), mp.mpmathify(self.front.mu)
        kz = mp.sqrt(eps) * mp.sqrt(mu) * self.cos_theta
        incident = [_flux(self._wave(eps, mu, kz, p)) for p in range(2)]
        r = [[values[out] for out in range(2)] for values in found]
        R = [[abs(r[p][out]) ** 2 * incident[out] / incident[p] for out in range(2)] for p in range(2)]
        t = T = None
        if self.back is not None:
            outgoing = [_flux(self._back_wave(out)) for out in range(2)]
            t = [[values[2 + out] for out in range(2)] for values in found]
            T = [[abs(t[p][out]) ** 2 * outgoing[out] / incident[p] for out in range(2)] for p in range(2)]
        A = [1 - sum(R[p]) - (sum(T[p]) if T else 0) for p in range(2)]
        absorbed, loads = [], []
        for p, values in enumerate(found):
            drops = [self._power(a, e, values) - self._power(b, e, values) for a, b, e in faces]
            ends = [self._end_loss(a, 0, values) + self._end_loss(b, 1, values) for a, b, _ in faces]
            absorbed.append(tuple(float(one / incident[p]) for one in drops))
            loads.append(tuple(float(one / incident[p]) for one in ends))
        as_complex = [[complex(one) for one in row] for row in r]
        as_t = None if t is None else [[complex(one) for one in row] for row in t]
        as_T = None if T is None else [[float(one) for one in row] for row in T]
        return MixedResponse(
            as_complex, as_t, [[float(x) for x in row] for row in R], as_T, [float(a) for a in A], absorbed, loads
        )

    def _power(self, face, element, values):
        fields, wires = face
        power = _flux([(row * values)[0] for row in fields])
        if wires:
            for weight, (_, phi, w) in zip(flux_weights(element), wires, strict=True):
                power += weight * mp.re((phi * values)[0] * mp.conj((w * values)[0]))
        return power

    def _end_loss(self, face, side, values):
        total = mp.mpf(0)
        for one in face[1]:
            weight = 1 if isinstance(one[0], MeshArray) else mp.mpmathify(one[0].n[2])
            total += weight * mp.re(self._load(one, side)) * abs((one[2] * values)[0]) ** 2
        return total


def _flux(fields):
    ex, ey, hx, hy = fields
    return mp.re(ex * mp.conj(hy) - ey * mp.conj(hx))
