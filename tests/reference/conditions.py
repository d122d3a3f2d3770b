"""The dense linear system of a stack: its unknowns, and every condition that ties them.

The unknowns are r, t and the state at the front face of each layer. Any field anywhere is a linear form in
them: a row of coefficients whose last entry is the share of the incident wave.

        front | layer 1 | sheet | layer 2 | ... | back
      1, r    | x_1               x_2             t (none behind a perfect conductor)
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import mpmath as mp

from tests.reference.layers import Grounded, HalfSpace, Joined, Open, Sheet, Slab
from tests.reference.waves import Wave, back_fields, front_fields


@dataclass(frozen=True)
class Face:
    """Linear forms of the state at one face and, if wires end there, how they end."""

    e: Any
    h: Any
    phi: Any = None
    w: Any = None
    end: Any = None


class System:
    """Conditions of a stack, collected from front to back; every equation is a linear form that vanishes."""

    def __init__(self, wave: Wave, n_states: int, has_back: bool) -> None:
        self.wave = wave
        self.next_state = 2 if has_back else 1
        self.size = self.next_state + n_states
        self.equations: list[Any] = []

    def unknown(self, index: int) -> Any:
        form = mp.matrix(1, self.size + 1)
        form[index] = 1
        return form

    def start(self, front: HalfSpace) -> Face:
        """Face of the front half-space: the incident wave and r times the reflected one."""
        e, h = front_fields(front, self.wave)
        r, incident, sign = self.unknown(0), self.unknown(self.size), self.wave.sign
        return Face(e * (incident - sign * r), h * (incident + sign * r))

    def pass_sheet(self, before: Face, sheet: Sheet) -> Face:
        """Face behind a sheet: z x (h_after - h_before) = y E_t. Wires keep to the layer they belong to."""
        y = mp.mpmathify(sheet.y_te if self.wave.polarization == "TE" else sheet.y_tm)
        return replace(before, h=before.h - self.wave.sign * y * before.e)

    def enter_layer(self, before: Face, slab: Slab, generator: Any) -> tuple[Face, Face]:
        """Both faces of the next layer, whose front face meets `before`."""
        states = mp.matrix(generator.rows, self.size + 1)
        for i in range(generator.rows):
            states[i, self.next_state + i] = 1
        self.next_state += generator.rows
        propagated = mp.expm(generator * (self.wave.k0 * mp.mpmathify(slab.thickness))) * states
        front, back = Face(states[0, :], states[1, :]), Face(propagated[0, :], propagated[1, :])
        if slab.wires is not None and generator.rows == 4:
            front = replace(front, phi=states[2, :], w=states[3, :], end=slab.wires.front)
            back = replace(back, phi=propagated[2, :], w=propagated[3, :], end=slab.wires.back)
        self.match_fields(before, front)
        self.end_wires(before, front)
        return front, back

    def finish(self, before: Face, back: HalfSpace | None) -> None:
        """The back half-space, or E = 0 on a perfect conductor (None)."""
        self.end_wires(before, Face(None, None))
        if back is None:
            self.equations.append(before.e)
            return
        e, h = back_fields(back, self.wave)
        self.match_fields(before, Face(e * self.unknown(1), h * self.unknown(1)))

    def match_fields(self, before: Face, after: Face) -> None:
        self.equations += [after.e - before.e, after.h - before.h]

    def end_wires(self, before: Face, after: Face) -> None:
        """Conditions on the wires that reach an interface from its two sides."""
        if isinstance(before.end, Joined) and isinstance(after.end, Joined):
            load = self.load(before) + self.load(after)
            self.equations += [after.w - before.w, after.phi - before.phi + load * before.w]
            return
        for face, outward in ((before, 1), (after, -1)):
            if isinstance(face.end, Joined):
                raise ValueError("a joined wire end meets no joined wire end")
            if isinstance(face.end, Open):
                self.equations.append(face.w)
            if isinstance(face.end, Grounded):
                self.equations.append(face.phi - outward * self.load(face) * face.w)

    def load(self, face: Face) -> Any:
        """Load of the wire end at a face, in the units of this system."""
        return mp.mpmathify(getattr(face.end, "load", 0)) * self.wave.k0**2

    def solve(self) -> Any:
        """Values of all unknowns, as a column, followed by the incident amplitude 1."""
        coefficients = mp.matrix(len(self.equations), self.size)
        sources = mp.matrix(len(self.equations), 1)
        for i, equation in enumerate(self.equations):
            coefficients[i, :] = equation[0, : self.size]
            sources[i] = -equation[self.size]
        return mp.matrix([*mp.lu_solve(coefficients, sources), 1])

    def flux(self, face: Face, values: Any) -> Any:
        """2 eta0 S_z at a face, with the power along its wires, for given values of the unknowns."""
        power = self.wave.sign * mp.re(self._value(face.e, values) * mp.conj(self._value(face.h, values)))
        if face.w is not None:
            power += mp.re(self._value(face.phi, values) * mp.conj(self._value(face.w, values)))
        return power

    def end_loss(self, face: Face, values: Any) -> Any:
        """2 eta0 times the power lost in the load of the wire end at a face, if there is one."""
        if face.w is None:
            return mp.mpf(0)
        return mp.re(self.load(face)) * abs(self._value(face.w, values)) ** 2

    @staticmethod
    def _value(form: Any, values: Any) -> Any:
        return (form * values)[0]
