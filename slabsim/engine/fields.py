"""Power flux at every interface, and the share of the incident power that each layer absorbs.

The kernel keeps, after every element on its way from the back to the front, the state (a, b) up to a factor and
the factor t of that element. From the front, where the incident wave fixes the scale, the factors are multiplied
up again:

    true state behind element e  =  state[e] * scale[e]        scale[e] = scale in front of e * t[e]

Inside a run of joined wires the state is known as a plane only. The wire's front end condition, carried through
the run as a covector, picks the true state out of the plane.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from slabsim.engine import kernels, rows
from slabsim.engine.pack import Recipe, pack
from slabsim.engine.response import check_grid, squares
from slabsim.errors import InputError
from slabsim.stack.sample import Model, Polarization, Stack


def absorbed_by_element(
    stack: Stack,
    frequency: float,
    angles_deg: np.ndarray | float,
    polarization: Polarization,
    model: Model | None = None,
) -> np.ndarray:
    """Share of the incident power lost in each layer and sheet, with the loads at its wire ends.

    Parameters
    ----------
    stack : Stack
    frequency : float
        [Hz].
    angles_deg : float array, shape (n_angles,)
        Angles of incidence [degrees].
    polarization : {"TE", "TM"}
    model : {"nonlocal", "local"}, optional
        Default: that of the stack's sweep.

    Returns
    -------
    float array, shape (n_elements, n_angles)
        In the order of ``stack.flatten()``. The sum over elements is the absorptance.

    Raises
    ------
    InputError
        If an argument is out of bounds.

    Notes
    -----
    A load in series in a joint counts with the layer in front of it. The flux is Re(Ex hy* - Ey hx* + phi w*)/(2 eta0):
    joined wires carry power through a face.
    """
    frequencies, angles_deg = check_grid(frequency, angles_deg)
    if polarization not in ("TE", "TM"):
        raise InputError(f"polarization is {polarization!r}; it must be 'TE' or 'TM'")
    recipe = pack(stack, model or stack.sweep.model, frequencies[:1])
    flux = np.concatenate(
        [
            _flux(recipe, angles_deg[start : start + rows.C], polarization)
            for start in range(0, angles_deg.size, rows.C)
        ],
        axis=1,
    )
    absorbed = np.zeros((len(stack.flatten()), angles_deg.size))
    for element, position in enumerate(recipe.positions):
        absorbed[position] += flux[element + 1] - flux[element]
    return absorbed


def _flux(recipe: Recipe, angles_deg: np.ndarray, polarization: Polarization) -> np.ndarray:
    """Flux over incident flux behind element 0, 1, ... and in front of the last, shape (n_elements + 1, n_angles)."""
    sin2, cos2 = squares(angles_deg)
    n_elements = recipe.kinds.size
    states = np.zeros((n_elements + 1, rows.N_ROWS * rows.C))
    switches = np.array([recipe.metal_back, True, True])
    kernels.trace(recipe.kinds, recipe.rows, recipe.tables, recipe.media, sin2, cos2, switches, states)
    work = states.reshape(n_elements + 1, rows.N_ROWS, rows.C)[:, :, : angles_deg.size]
    row, m = (rows.TM, rows.FRONT_EPS) if polarization == "TM" else (rows.TE, rows.FRONT_MU)
    z = np.sqrt(recipe.media[rows.FRONT_EPS, 0] * recipe.media[rows.FRONT_MU, 0] * cos2) / recipe.media[m, 0]
    a, b = _complex(work[-1], row, row + 2)
    scale = 2.0 * z / (z * a + b)
    flux = np.empty((n_elements + 1, angles_deg.size))
    flux[-1] = np.real(b * np.conj(a)) * abs(scale) ** 2 / z
    run = None
    for e in range(n_elements - 1, -1, -1):
        behind, after, kind = work[e], work[e + 1], recipe.kinds[e]
        if kind == rows.WIRE_FRONT and polarization == "TM":
            run = _Run(after)
        if run is not None and kind != rows.WIRE_BACK:
            run.step(kind, after)
            flux[e] = run.power(behind) * abs(scale) ** 2 / z
            continue
        scale = scale * (_complex(after, row + 4) if run is None else run.transmission)
        run = None
        a, b = _complex(behind, row, row + 2)
        flux[e] = np.real(b * np.conj(a)) * abs(scale) ** 2 / z
    return flux


class _Run:
    """The covector g (h, v, e, psi) that vanishes on the true state, carried from the front through a run."""

    def __init__(self, front: np.ndarray) -> None:
        nu, omega = _complex(front, rows.NU, rows.OMEGA)
        zero = np.zeros_like(nu)
        self.g = (zero, omega, zero, -nu)
        self.transmission = _complex(front, rows.TM + 4)

    def step(self, kind: int, after: np.ndarray) -> None:
        """Pass one kernel element, whose workspace is `after`."""
        h, v, e, psi = self.g
        if kind == rows.WIRE_RUN:
            e, psi, h, v = _transfer(after, e, psi, h, v)  # the transposed transfer swaps (h, v) and (e, psi)
        elif kind == rows.WIRE_JOINT:
            ratio, load = after[rows.RATIO], _complex(after, rows.LOAD)
            v, psi = ratio * (v + load * psi), psi / ratio
        self.g = tuple(after[rows.SCALE] * part for part in (h, v, e, psi))

    def power(self, behind: np.ndarray) -> np.ndarray:
        """Re(e h* + psi v*) of the state that the covector picks from the plane `behind`."""
        gh, gv, ge, gp = self.g
        hv, hp, ev, ep, he = _complex(behind, *(rows.RUN + 2 * j for j in range(5)))
        h = gv * hv + ge * he + gp * hp
        e = gv * ev + gp * ep - gh * he
        v = -gh * hv - ge * ev - gp * he
        psi = gv * he - gh * hp - ge * ep
        return np.real(e * np.conj(h) + psi * np.conj(v))


def _transfer(work: np.ndarray, h: Any, v: Any, e: Any, psi: Any) -> tuple[np.ndarray, ...]:
    """Scaled transfer of a wire layer, back to front: `kernels` states its functions."""
    eps, inv_eps = _complex(work, rows.EPS, rows.INV_EPS)
    c = work[rows.KP] * np.sqrt(work[rows.S2])
    half, xc, yc, xg, yg, xw, yw = _complex(work, rows.DA, rows.XC, rows.YC, rows.XG, rows.YG, rows.XW, rows.YWW)

    def apply(mean: Any, difference: Any, first: Any, second: Any) -> tuple[Any, Any]:
        tilt = half * difference
        return (mean + tilt) * first + c * difference * second, (mean - tilt) * second + c * difference * first

    from_u, from_y = apply(xc, yc, h, v), apply(xg, yg, eps * e, eps * psi)
    to_u = from_u[0] + from_y[0], from_u[1] + from_y[1]
    from_u, from_y = apply(xw, yw, inv_eps * h, inv_eps * v), apply(xc, yc, e, psi)
    return *to_u, from_u[0] + from_y[0], from_u[1] + from_y[1]


def _complex(work: np.ndarray, *rows: int) -> Any:
    values = tuple(work[row] + 1j * work[row + 1] for row in rows)
    return values if len(values) > 1 else values[0]
