"""What the reference solver is told about a stack, and the state equations of one layer.

Nothing here knows slabsim: a stack is plain numbers, SI units, time factor exp(-i w t), h = eta0 H.
Inside, lengths are measured in 1/k0, so that every component of a state is a field in V/m:

    TE: (Ey, hx)        TM: (Ex, hy)        TM, nonlocal wires along z: (Ex, hy, k0 phi, w/k0)

Numbers may be Python or mpmath numbers, or strings of decimals.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import mpmath as mp
import numpy as np

Number = Any  # int, float, complex, mpf, mpc or a string of decimals


@dataclass(frozen=True)
class HalfSpace:
    """A half-space of relative permittivity `eps` and permeability `mu`."""

    eps: Number = 1
    mu: Number = 1


@dataclass(frozen=True)
class Open:
    """A wire end that touches nothing: no current."""


@dataclass(frozen=True)
class Grounded:
    """A wire end on a conductor, through a load Z: `load` = Z A / eta0 [m^2]."""

    load: Number = 0


@dataclass(frozen=True)
class Joined:
    """A wire end on the wire of the neighbouring layer; the loads given on the two sides are in series."""

    load: Number = 0


End = Open | Grounded | Joined


@dataclass(frozen=True)
class WireArray:
    """Wires along z: plasma wavenumber `kp` [1/m], `zeta` = Zw A / eta0 [m], and their two ends."""

    kp: Number
    zeta: Number = 0
    front: End = Open()
    back: End = Open()


@dataclass(frozen=True)
class Slab:
    """A layer of an isotropic host, `thickness` [m], with wires or without."""

    eps: Number
    mu: Number
    thickness: Number
    wires: WireArray | None = None


@dataclass(frozen=True)
class Sheet:
    """A sheet of zero thickness, z x (h_after - h_before) = y E_t, `y` per polarization at this angle."""

    y_te: Number
    y_tm: Number


def generator(slab: Slab, k0: Any, kx: Any, polarization: str, model: str) -> Any:
    """Matrix G of the layer's state equations, d(state)/d(k0 z) = G state.

    Parameters
    ----------
    slab : Slab
    k0 : mpf
        Free-space wavenumber [1/m].
    kx : mpf
        Transverse wavenumber over k0.
    polarization : {"TE", "TM"}
    model : {"nonlocal", "local"}

    Returns
    -------
    mp.matrix, shape (2, 2) or (4, 4)
    """
    eps, mu = mp.mpmathify(slab.eps), mp.mpmathify(slab.mu)
    if polarization == "TE":
        # i kx Ey = i mu hz;  dEy = -i mu hx;  dhx = i kx hz - i eps Ey.  Ez = 0: wires along z see nothing
        return mp.matrix([[0, -1j * mu], [1j * kx * kx / mu - 1j * eps, 0]])
    if slab.wires is None:
        ez = mp.matrix([[0, -kx / eps]])  # i kx hy = -i eps Ez
        return _tm_field_rows(ez, eps, mu, kx)
    kp = mp.mpmathify(slab.wires.kp) / k0
    xi = mp.mpmathify(slab.wires.zeta) * k0 - 1j / kp**2
    if model == "local":
        ez = mp.matrix([[0, 1j * kx / (1 / xi - 1j * eps)]])  # i kx hy = -i eps Ez + Ez / xi
        return _tm_field_rows(ez, eps, mu, kx)
    ez = mp.matrix([[0, -kx / eps, 0, -1j / eps]])  # i kx hy = -i eps Ez + w
    rows = mp.matrix(4, 4)
    rows[:2, :] = _tm_field_rows(ez, eps, mu, kx)
    rows[2, :] = ez - mp.matrix([[0, 0, 0, xi]])  # dphi = Ez - xi w
    rows[3, 2] = 1j * eps * kp**2  # dw = i eps kp^2 phi
    return rows


def _tm_field_rows(ez: Any, eps: Any, mu: Any, kx: Any) -> Any:
    """Rows dEx = i kx Ez + i mu hy and dhy = i eps Ex, `ez` being the row that gives Ez from the state."""
    rows = mp.matrix(2, ez.cols)
    rows[0, :] = 1j * kx * ez
    rows[0, 1] += 1j * mu
    rows[1, 0] = 1j * eps
    return rows


def digits_of_growth(matrix: Any, depth: Any) -> float:
    """Decimal digits by which the fastest solution grows over `depth`; it only chooses the precision."""
    rates = np.linalg.eigvals(np.array(matrix.tolist(), dtype=complex)).real
    return float(np.max(np.abs(rates))) * float(depth) / math.log(10)
