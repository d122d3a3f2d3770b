"""Reflection and transmission of a stack by brute force: the reference that slabsim is compared with.

The state equations of every layer are integrated with the matrix exponential of their raw generator, in as
many digits as the layer's growth asks for, and all interface and wire-end conditions of the stack are solved
as one dense linear system. Slow, and nothing clever that could be wrong.

Conventions: exp(-i w t); plane of incidence x-z; TE amplitude a: Ey = a; TM amplitude a: hy = a sqrt(eps/mu);
r at the first interface, t at the last one.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import mpmath as mp

from tests.reference.conditions import Face, System
from tests.reference.layers import (
    Grounded,
    HalfSpace,
    Joined,
    Number,
    Open,
    Sheet,
    Slab,
    WireArray,
    digits_of_growth,
    generator,
)
from tests.reference.waves import Wave, back_fields, front_fields, incident_wave

__all__ = ["Grounded", "HalfSpace", "Joined", "Open", "Response", "Sheet", "Slab", "WireArray", "solve"]

GUARD_DIGITS = 20


@dataclass(frozen=True)
class Response:
    """What a stack does to one plane wave.

    Attributes
    ----------
    r, t : complex
        Amplitude ratios; `r` in TM has the sign of the H ratio. `t` is None behind a perfect conductor.
    R, T, A : float
        Powers; `A` is exact to its own last digits, also where R + T is nearly 1.
    flux_before, flux_after : tuple of float
        Per element: S_z over the incident S_z just inside its two faces, power along the wires included.
        At a sheet: the power of the fields alone.
    absorbed : tuple of float
        Per element: flux_before - flux_after.
    end_loads : tuple of (float, float)
        Per element: power lost in the load given for the front and for the back end of its wires, which
        `absorbed` leaves out: A = sum of absorbed + sum of end_loads.
    """

    r: complex
    t: complex | None
    R: float
    T: float
    A: float
    flux_before: tuple[float, ...]
    flux_after: tuple[float, ...]
    absorbed: tuple[float, ...]
    end_loads: tuple[tuple[float, float], ...]


def solve(
    front: HalfSpace,
    elements: Sequence[Slab | Sheet],
    back: HalfSpace | str,
    k0: Number,
    theta: Number,
    polarization: str,
    model: str = "nonlocal",
    digits: int = 30,
) -> Response:
    """Response of a stack to one plane wave.

    Parameters
    ----------
    front : HalfSpace
        Lossless: eps and mu real and positive.
    elements : sequence of Slab or Sheet
        Front to back.
    back : HalfSpace or "perfect conductor"
    k0 : number
        Free-space wavenumber [1/m].
    theta : number
        Angle of incidence [rad]; near grazing an mpf or a string keeps the digits of cos(theta).
    polarization : {"TE", "TM"}
    model : {"nonlocal", "local"}
        Of all wires.
    digits : int
        Decimal digits of r and t before they are rounded to double precision.

    Returns
    -------
    Response
    """
    _check(front, back, polarization, model)
    with mp.workdps(digits + GUARD_DIGITS):
        wave = incident_wave(front, k0, theta, polarization)
        extra = _extra_digits([_generator(element, wave, model) for element in elements], elements, wave)
    with mp.workdps(digits + GUARD_DIGITS + extra):
        wave = incident_wave(front, k0, theta, polarization)
        generators = [_generator(element, wave, model) for element in elements]
        return _respond(front, elements, None if isinstance(back, str) else back, wave, generators)


def _check(front: HalfSpace, back: HalfSpace | str, polarization: str, model: str) -> None:
    if polarization not in ("TE", "TM"):
        raise ValueError(f"polarization is {polarization!r}; it must be 'TE' or 'TM'")
    if model not in ("nonlocal", "local"):
        raise ValueError(f"model is {model!r}; it must be 'nonlocal' or 'local'")
    if isinstance(back, str) and back != "perfect conductor":
        raise ValueError(f"back is {back!r}; it must be a HalfSpace or 'perfect conductor'")
    for value in (mp.mpmathify(front.eps), mp.mpmathify(front.mu)):
        if value.imag != 0 or value.real <= 0:
            raise ValueError(f"front is {front}; its eps and mu must be real and positive")


def _generator(element: Slab | Sheet, wave: Wave, model: str) -> Any:
    if isinstance(element, Sheet):
        return None
    return generator(element, wave.k0, wave.kx, wave.polarization, model)


def _extra_digits(generators: list[Any], elements: Sequence[Slab | Sheet], wave: Wave) -> int:
    """Digits that growth across the layers and the spread of the generators' entries can cost."""
    growths, spread = [0.0], 0.0
    for matrix, element in zip(generators, elements, strict=True):
        if isinstance(element, Slab):
            growths.append(digits_of_growth(matrix, wave.k0 * mp.mpmathify(element.thickness)))
            spread = max(spread, float(mp.log10(mp.mnorm(matrix, 1))))
    # |t| is as small as the sum; in the thickest layer the decaying field is lost beside the growing one
    return int(sum(growths) + max(growths) + 2 * spread) + 1


def _respond(
    front: HalfSpace,
    elements: Sequence[Slab | Sheet],
    back: HalfSpace | None,
    wave: Wave,
    generators: list[Any],
) -> Response:
    n_states = sum(matrix.rows for matrix in generators if matrix is not None)
    system = System(wave, n_states, has_back=back is not None)
    face, faces = system.start(front), []
    for element, matrix in zip(elements, generators, strict=True):
        if isinstance(element, Sheet):
            before, face = face, system.pass_sheet(face, element)
            faces.append((Face(before.e, before.h), Face(face.e, face.h)))
        else:
            faces.append(system.enter_layer(face, element, matrix))
            face = faces[-1][1]
    system.finish(face, back)
    values = system.solve()
    e, h = front_fields(front, wave)
    incident = wave.sign * mp.re(e * mp.conj(h))
    r, t, T = values[0], None, mp.mpf(0)
    if back is not None:
        t = values[1]
        e, h = back_fields(back, wave)
        T = abs(t) ** 2 * wave.sign * mp.re(e * mp.conj(h)) / incident
    fluxes = [[system.flux(side, values) / incident for side in pair] for pair in faces]
    return Response(
        r=complex(r),
        t=None if t is None else complex(t),
        R=float(abs(r) ** 2),
        T=float(T),
        A=float(1 - abs(r) ** 2 - T),
        flux_before=tuple(float(before) for before, _ in fluxes),
        flux_after=tuple(float(after) for _, after in fluxes),
        absorbed=tuple(float(before - after) for before, after in fluxes),
        end_loads=tuple(
            (float(system.end_loss(a, values) / incident), float(system.end_loss(b, values) / incident))
            for a, b in faces
        ),
    )
