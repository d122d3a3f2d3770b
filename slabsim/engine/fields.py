"""Power flux at every interface, and the share of the incident power that each layer and each set of wires absorbs.

All stacks go through the four-port kernels here. On its way from the back to the front the kernel carries, beside the
state G, the map from the waves a in front of an element to those behind it. From the front, where the incident wave
is known, the maps are applied one after another; the flux through a plane, with the power on joined wires, is
|a|^2 - |b|^2 with b = G a.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from slabsim.engine import port_rows as rows
from slabsim.engine import ports
from slabsim.engine.interiors import Interior, metal_losses
from slabsim.engine.port_pack import PortRecipe, pack_ports
from slabsim.engine.response import check_grid, squares
from slabsim.engine.rows import LANES
from slabsim.errors import InputError
from slabsim.stack.sample import Layer, Model, Polarization, Stack

_LAYERS = (rows.DIAGONAL, rows.MIRROR, rows.TILTED)


@dataclass(frozen=True)
class Loss:
    """Share of the incident power lost in one element of a stack, or in the metal of one set of its wires.

    Attributes
    ----------
    element : int
        Position in ``stack.flatten()``.
    name : str
        Of the element.
    part : str
        "" for the whole element, loads at its wire ends included; "wires 1", "wires 2" or "mesh" for the metal alone.
    shares : tuple of float
        For each incident polarization of the sweep.
    """

    element: int
    name: str
    part: str
    shares: tuple[float, ...]


def losses(
    stack: Stack, frequency: float, angle_deg: float, azimuth_deg: float = 0.0, model: Model | None = None
) -> list[Loss]:
    """Where the absorbed power goes, at one point.

    Parameters
    ----------
    stack : Stack
    frequency : float
        [Hz].
    angle_deg, azimuth_deg : float
        Of incidence [degrees].
    model : {"nonlocal", "local"}, optional
        Default: that of the stack's sweep.

    Returns
    -------
    list of Loss
        Front to back; after each layer with wires its sets. The whole elements add up to the absorptance.

    Raises
    ------
    InputError
        If an argument is out of bounds.
    """
    frequencies, angles = check_grid(frequency, angle_deg)
    model = model or stack.sweep.model
    recipe = pack_ports(stack, model, frequencies[:1], angles[:1], azimuth_deg)
    waves = {one: _Waves(recipe, angles[:1], one) for one in stack.sweep.polarizations}
    found = []
    for position, element in enumerate(stack.flatten()):
        whole = tuple(float(one.absorbed(position)[0]) for one in waves.values())
        found.append(Loss(position, element.name, "", whole))
        if isinstance(element, Layer) and element.has_wires:
            point = model, float(frequencies[0]), azimuth_deg
            parts = zip(*(metal_losses(one.interior(position), element, *point) for one in waves.values()), strict=True)
            names = [f"wires {k + 1}" for k in range(len(element.wires))] + ["mesh"] * (element.mesh is not None)
            found += [Loss(position, element.name, name, shares) for name, shares in zip(names, parts, strict=True)]
    return found


def absorbed_by_element(
    stack: Stack,
    frequency: float,
    angles_deg: np.ndarray | float,
    polarization: Polarization,
    model: Model | None = None,
    azimuth_deg: float = 0.0,
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
        Of the incident wave.
    model : {"nonlocal", "local"}, optional
        Default: that of the stack's sweep.
    azimuth_deg : float
        Azimuth of the plane of incidence [degrees].

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
    A load in series in a joint counts with the layer in front of it. The flux is
    Re(Ex hy* - Ey hx* + n_z phi w*)/(2 eta0): joined wires carry power through a face.
    """
    frequencies, angles = check_grid(frequency, angles_deg)
    if polarization not in ("TE", "TM"):
        raise InputError(f"polarization is {polarization!r}; it must be 'TE' or 'TM'")
    absorbed = np.zeros((len(stack.flatten()), angles.size))
    for start in range(0, angles.size, LANES):
        some = angles[start : start + LANES]
        recipe = pack_ports(stack, model or stack.sweep.model, frequencies[:1], some, azimuth_deg)
        waves = _Waves(recipe, some, polarization)
        for position in range(absorbed.shape[0]):
            absorbed[position, start : start + LANES] = waves.absorbed(position)
    return absorbed


class _Waves:
    """Waves and flux between the elements of a recipe, at one frequency, at most LANES angles, one polarization."""

    def __init__(self, recipe: PortRecipe, angles_deg: np.ndarray, polarization: Polarization) -> None:
        self.recipe = recipe
        self.n_angles = angles_deg.size
        n_elements = recipe.elements.shape[0]
        self.states = np.zeros((n_elements + 1, ports.workspace(recipe.n_ports)))
        ports.trace_ports(recipe.arrays, *squares(angles_deg), recipe.metal_back, recipe.n_ports, self.states)
        self.counts = _port_counts(recipe)
        a = self._incident(polarization)
        self.a = [a]  # behind element 0, between elements 0 and 1, ..., in front of the last
        for e in range(n_elements - 1, -1, -1):  # front to back
            behind = self.counts[e]
            onward = self.matrix(e + 1, ports.H, 2 + behind, self.counts[e + 1])[:, 2:]
            a = np.einsum("aij,aj->ai", onward, a)
            self.a.insert(0, a)
        self.flux = [self._flux(e) for e in range(n_elements + 1)]

    def row(self, at: int) -> np.ndarray:
        """A row of the workspace, shape (n_angles,)."""
        return self.states[0, at : at + self.n_angles]

    def matrix(self, state: int, slot: int, n: int, m: int) -> np.ndarray:
        """A slot of the workspace after `state` elements: complex array of shape (n_angles, n, m)."""
        start = ports.HEAD + slot * ports.slot_size(self.recipe.n_ports)
        parts = self.states[state, start : start + 2 * LANES * n * m].reshape(n, m, 2, LANES)
        return np.moveaxis(parts[:, :, 0] + 1j * parts[:, :, 1], 2, 0)[: self.n_angles]

    def absorbed(self, position: int) -> np.ndarray:
        """Share lost in one element of the stack, shape (n_angles,)."""
        lost = np.zeros(self.n_angles)
        for e, place in enumerate(self.recipe.positions):
            if place == position:
                lost = lost + self.flux[e + 1] - self.flux[e]
        return lost

    def interior(self, position: int) -> Interior:
        """Inside of a layer, at the first angle."""
        recipe = self.recipe
        e = next(k for k, p in enumerate(recipe.positions) if p == position and recipe.elements[k][0] in _LAYERS)
        element = recipe.elements[e]
        n, first = int(element[rows.N_PORTS]), int(element[rows.FIRST_END])
        values = recipe.table[element[rows.ROW] :, 0]
        ends = recipe.ends[first : first + n - 2]
        return Interior(
            blocks=tuple(self.matrix(e + 1, slot, n, n)[0] for slot in (ports.A, ports.B, ports.D)),
            depth=float(values[rows.DEPTH]),
            behind=self.matrix(e, ports.G, self.counts[e], self.counts[e])[0],
            continues=tuple(int(end[rows.BEHIND]) for end in ends),
            is_kept=tuple(bool(end[rows.KEPT]) for end in ends),
            rho_back=tuple(complex(*values[end[rows.RHO_BACK] :][:2]) for end in ends),
            rho_front=tuple(complex(*values[end[rows.RHO_FRONT] :][:2]) for end in ends),
            front=self.a[e + 1][0],
            y=float(recipe.scales[e][0]),
            references=tuple(float(one[0]) for one in recipe.references[e]),
            s=float(self.row(ports.AT_S)[0]),
            q2=float(self.row(ports.AT_Q2)[0]),
        )

    def _incident(self, polarization: Polarization) -> np.ndarray:
        """Waves a at the front face, shape (n_angles, 2); their |a|^2 counts in units of the incident flux."""
        eps, mu, y = (self.recipe.media[row, 0] for row in (rows.FRONT_EPS, rows.FRONT_MU, rows.FRONT_Y))
        g = self.matrix(-1, ports.G, 2, 2)
        v, i = (np.eye(2) + g) / np.sqrt(y), (np.eye(2) - g) * np.sqrt(y)
        z_p, y_s = np.sqrt(self.row(ports.AT_Q2)) / eps, np.sqrt(self.row(ports.AT_Q2)) / mu
        system = np.stack([v[:, 0] + z_p[:, None] * i[:, 0], y_s[:, None] * v[:, 1] + i[:, 1]], axis=1)
        source = np.zeros((self.n_angles, 2, 1), dtype=complex)
        source[:, 0 if polarization == "TM" else 1, 0] = 2.0 * np.sqrt(z_p if polarization == "TM" else y_s)
        return np.linalg.solve(system, source)[:, :, 0]

    def _flux(self, e: int) -> np.ndarray:
        g = self.matrix(e, ports.G, self.counts[e], self.counts[e])
        b = np.einsum("aij,aj->ai", g, self.a[e])
        return (abs(self.a[e]) ** 2 - abs(b) ** 2).sum(axis=1)


def _port_counts(recipe: PortRecipe) -> list[int]:
    """Ports of the state behind the first element and after each."""
    counts = [2]
    for element in recipe.elements:
        count = counts[-1]
        if element[rows.KIND] in _LAYERS:
            first, extra = element[rows.FIRST_END], element[rows.N_PORTS] - 2
            count = 2 + int(recipe.ends[first : first + extra, rows.KEPT].sum())
        counts.append(2 if element[rows.KIND] == rows.PLATES else count)
    return counts
