"""Plane waves of the half-spaces in front of and behind a stack, in units of 1/k0."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import mpmath as mp

from tests.reference.layers import HalfSpace, Number


@dataclass(frozen=True)
class Wave:
    """The incident wave: `k0` [1/m], cos(theta), and the transverse wavenumber `kx` over k0."""

    k0: Any
    cos_theta: Any
    kx: Any
    polarization: str

    @property
    def sign(self) -> int:
        """Sign in S_z = Re(sign E h* + phi w*) / (2 eta0): the pair (E, h) is (Ey, hx) or (Ex, hy)."""
        return -1 if self.polarization == "TE" else 1


def incident_wave(front: HalfSpace, k0: Number, theta: Number, polarization: str) -> Wave:
    theta = mp.mpmathify(theta)
    index = mp.sqrt(mp.mpmathify(front.eps).real) * mp.sqrt(mp.mpmathify(front.mu).real)
    return Wave(mp.mpmathify(k0), mp.cos(theta), index * mp.sin(theta), polarization)


def front_fields(front: HalfSpace, wave: Wave) -> tuple[Any, Any]:
    """(E, h) of the incident wave."""
    eps, mu = mp.mpmathify(front.eps), mp.mpmathify(front.mu)
    return _fields(eps, mu, mp.sqrt(eps) * mp.sqrt(mu) * wave.cos_theta, wave)


def back_fields(back: HalfSpace, wave: Wave) -> tuple[Any, Any]:
    """(E, h) of the outgoing wave of unit amplitude: decaying or, if kz is real, carrying power away."""
    eps, mu = mp.mpmathify(back.eps), mp.mpmathify(back.mu)
    kz = mp.sqrt(eps * mu - wave.kx**2)
    outward = mp.re(kz / (mu if wave.polarization == "TE" else eps))
    if mp.im(kz) < 0 or (mp.im(kz) == 0 and outward < 0):
        kz = -kz
    return _fields(eps, mu, kz, wave)


def _fields(eps: Any, mu: Any, kz: Any, wave: Wave) -> tuple[Any, Any]:
    """(E, h) of the wave exp(i kz z) of unit amplitude."""
    if wave.polarization == "TE":
        return mp.mpc(1), -kz / mu  # i kz Ey = -i mu hx
    hy = mp.sqrt(eps) / mp.sqrt(mu)  # not sqrt(eps / mu): this is the limit of small loss also if mu < 0
    return kz * hy / eps, hy  # i kz hy = i eps Ex
