"""The generator of a layer in the four-port engine, as a list of entries.

With v = (Ep, Es, psi...), i = (hs, -hp, V...) and lengths in units of 1/k0,

    dv/dz = i (D v + A i)      di/dz = i (B v + D^T i)      A, B symmetric

    A = [[mu_ss - s^2/eps_z, -mu_ps, s kp/eps_z...], [-mu_ps, mu_pp, 0...], [s kp/eps_z, 0, a]]
    B = [[eps_pp, eps_ps, 0...], [eps_ps, eps_ss - s^2/mu_z, 0...], [0, 0, eps_h]]
    D = [[0, 0, 0], [0, 0, 0], [-kp n_p/n_z, -kp n_s/n_z, -s n_p/n_z]]

kp here over k0; a = (m + zc)/n_z^2 - kp^2/eps_z, and -kp kp'/eps_z between two sets. Wires parallel to the faces add
-kp^2 n n^T/(m + zc - s^2 n_p^2/eps_h) to B. A mesh is a set along z with eps_h l0, and its horizontal wires add with
g = i/(k0 xi): g to B_pp and B_ss, g s/kp to B_p,psi, and g s^2/kp^2 to B_psi,psi.

Local model: the full tensor eps + sum g n n^T, with Ez eliminated.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from math import cos, sin

import numpy as np

from slabsim.engine import port_rows as rows
from slabsim.engine.wire_numbers import WireNumbers, wire_numbers
from slabsim.errors import InputError
from slabsim.materials.mesh import stiffness
from slabsim.stack.sample import ALONG_Z, Direction, Layer, Mesh, WireSet

_BLOCKS = {"A": rows.BLOCK_A, "B": rows.BLOCK_B, "D": rows.BLOCK_D}
_ROUND = 1e-15  # sine or cosine below which an angle counts as a multiple of 90 degrees


@dataclass
class Generator:
    """Entries of a layer's generator and its extra ports.

    Attributes
    ----------
    n_ports : int
    terms : list of (block, entry, multiplier, values)
        `values`: complex array of shape (n_freqs,).
    resonances : list of (c0, c1)
        Complex arrays of shape (n_freqs,).
    crossing : list of (WireSet or Mesh, WireNumbers, float array)
        What the ports from 2 on belong to, and the reference kp [rad/m] of each, shape (n_freqs,).
    """

    n_ports: int
    terms: list[tuple[int, int, int, np.ndarray]] = field(default_factory=list)
    resonances: list[tuple[np.ndarray, np.ndarray]] = field(default_factory=list)
    crossing: list[tuple[WireSet | Mesh, WireNumbers, np.ndarray]] = field(default_factory=list)

    @property
    def kind(self) -> int:
        """DIAGONAL, MIRROR or TILTED."""
        if any(block == rows.BLOCK_D for block, *_ in self.terms):
            return rows.TILTED
        is_diagonal = self.n_ports == 2 and all(entry in (0, 3) for _, entry, *_ in self.terms)
        return rows.DIAGONAL if is_diagonal else rows.MIRROR

    def add(self, block: str, i: int, j: int, values: np.ndarray, multiplier: int = rows.ONE) -> None:
        """Add to an entry; to its mirror image as well in A and B."""
        if not np.any(values):
            return
        self.terms.append((_BLOCKS[block], i * self.n_ports + j, multiplier, values))
        if block != "D" and i != j:
            self.terms.append((_BLOCKS[block], j * self.n_ports + i, multiplier, values))


def turned(n: Direction, rotation: float, azimuth: float) -> Direction:
    """A direction of a layer turned by `rotation`, seen from the plane of incidence at `azimuth` [rad]: (p, s, z)."""
    c, s = cos_sin(rotation - azimuth)
    return n[0] * c - n[1] * s, n[0] * s + n[1] * c, n[2]


def cos_sin(angle: float) -> tuple[float, float]:
    """Cosine and sine [rad], exactly 0 at multiples of 90 degrees."""
    c, s = cos(angle), sin(angle)
    return (0.0 if abs(c) < _ROUND else c), (0.0 if abs(s) < _ROUND else s)


def layer_generator(
    layer: Layer,
    is_local: bool,
    frequencies: np.ndarray,
    index2: np.ndarray,
    azimuth: float,
    reference: Callable[[WireSet | Mesh], np.ndarray | None],
) -> Generator:
    """Generator of a layer.

    Parameters
    ----------
    layer : Layer
    is_local : bool
        Local model of the wires.
    frequencies, index2 : float arrays, shape (n_freqs,)
        [Hz]; squared index of the front medium.
    azimuth : float
        Of the plane of incidence [rad].
    reference : callable
        Reference kp [rad/m], shape (n_freqs,), of a set that is joined to the next layer, else None.

    Raises
    ------
    InputError
        If there are too many sets of wires parallel to the faces.
    """
    if is_local:
        return _local(layer, frequencies, index2, azimuth)
    crossing = [wires for wires in layer.wires if wires.crosses_faces]
    found = Generator(2 + len(crossing) + (layer.mesh is not None))
    eps, mu = _tensor(layer, frequencies, azimuth, "eps"), _tensor(layer, frequencies, azimuth, "mu")
    _medium(found, eps, mu, index2)
    if len(layer.wires) - len(crossing) > rows.MOST_SETS:
        raise InputError(
            f'layer "{layer.name}" has {len(layer.wires) - len(crossing)} sets of wires parallel to the faces; at most '
            f"{rows.MOST_SETS} are allowed"
        )
    for wires in layer.wires:
        numbers = wire_numbers(layer, wires, frequencies)
        n = turned(wires.direction, layer.rotation, azimuth)
        if wires.crosses_faces:
            _crossing(found, wires, numbers, n, eps[3], _reference(numbers, reference(wires)))
        else:
            _parallel(found, numbers, n, index2)
    if layer.mesh is not None:
        numbers = wire_numbers(layer, layer.mesh, frequencies)
        _mesh(found, layer.mesh, numbers, eps[3], index2, _reference(numbers, reference(layer.mesh)))
    return found


def _reference(numbers: WireNumbers, given: np.ndarray | None) -> np.ndarray:
    """kp that scales potential and current of a port: it makes the wave impedance of lossy wires about one."""
    if given is not None:
        return given
    return numbers.kp * abs(numbers.inductance + numbers.zc) ** -0.25


def _tensor(layer: Layer, frequencies: np.ndarray, azimuth: float, which: str) -> tuple[np.ndarray, ...]:
    """pp, ps, ss, zz of eps or mu."""
    material = layer.material
    axes = material.permittivity_axes if which == "eps" else material.permeability_axes
    x, y, z = axes(frequencies)
    if np.array_equal(x, y):
        return x, np.zeros_like(x), x, z
    c, s = cos_sin(layer.rotation - azimuth)
    return x * c**2 + y * s**2, (x - y) * (s * c), x * s**2 + y * c**2, z


def _medium(found: Generator, eps: tuple[np.ndarray, ...], mu: tuple[np.ndarray, ...], index2: np.ndarray) -> None:
    found.add("A", 0, 0, mu[2] - index2 / eps[3])
    found.add("A", 0, 0, 1.0 / eps[3], rows.COSINE2)
    found.add("A", 0, 1, -mu[1])
    found.add("A", 1, 1, mu[0])
    found.add("B", 0, 0, eps[0])
    found.add("B", 0, 1, eps[1])
    found.add("B", 1, 1, eps[2] - index2 / mu[3])
    found.add("B", 1, 1, 1.0 / mu[3], rows.COSINE2)


def _crossing(
    found: Generator,
    wires: WireSet | Mesh,
    numbers: WireNumbers,
    n: Direction,
    eps_z: np.ndarray,
    reference: np.ndarray,
    l0: float = 1.0,
) -> None:
    port = 2 + len(found.crossing)
    ratio = reference / numbers.kp
    kappa = numbers.kappa_p * ratio
    found.add("A", 0, port, kappa / eps_z, rows.SINE)
    for other, (_, theirs, their_reference) in enumerate(found.crossing, start=2):
        found.add("A", other, port, -kappa * theirs.kappa_p * (their_reference / theirs.kp) / eps_z)
    found.add("A", port, port, ratio**2 * (numbers.inductance + numbers.zc) / n[2] ** 2 - kappa**2 / eps_z)
    found.add("B", port, port, l0 * numbers.charge / ratio**2)
    found.add("D", port, 0, -kappa * (n[0] / n[2]) + 0j)
    found.add("D", port, 1, -kappa * (n[1] / n[2]) + 0j)
    found.add("D", port, port, np.full(kappa.shape, -n[0] / n[2] + 0j), rows.SINE)
    found.crossing.append((wires, numbers, reference))


def _parallel(found: Generator, numbers: WireNumbers, n: Direction, index2: np.ndarray) -> None:
    strength = -(numbers.kappa_p**2) + 0j
    multiplier = rows.ONE
    if n[0] == 0.0:
        strength = numbers.local
    else:
        multiplier = rows.RESONANCE + len(found.resonances)
        slope = n[0] ** 2 / numbers.charge
        found.resonances.append((numbers.inductance + numbers.zc - slope * index2, slope))
    found.add("B", 0, 0, strength * n[0] ** 2, multiplier)
    found.add("B", 0, 1, strength * (n[0] * n[1]), multiplier)
    found.add("B", 1, 1, strength * n[1] ** 2, multiplier)


def _mesh(
    found: Generator,
    mesh: Mesh,
    numbers: WireNumbers,
    eps_z: np.ndarray,
    index2: np.ndarray,
    reference: np.ndarray,
) -> None:
    port = found.n_ports - 1
    l0 = stiffness(mesh.pitch, mesh.radius, numbers.kp) if mesh.stiffness is None else mesh.stiffness
    g = numbers.local
    _crossing(found, mesh, numbers, ALONG_Z, eps_z, reference, l0)
    found.add("B", 0, 0, g)
    found.add("B", 1, 1, g)
    kappa = numbers.kappa_p * (reference / numbers.kp)
    found.add("B", 0, port, g / kappa, rows.SINE)
    found.add("B", port, port, g * index2 / kappa**2)
    found.add("B", port, port, -g / kappa**2, rows.COSINE2)


def local_tensor(layer: Layer, frequencies: np.ndarray, azimuth: float) -> np.ndarray:
    """Permittivity of a layer with wires in the local model, along (p, s, z): complex array, shape (3, 3, n_freqs)."""
    pp, ps, ss, zz = _tensor(layer, frequencies, azimuth, "eps")
    zero = np.zeros_like(pp)
    eps = np.array([[pp, ps, zero], [ps, ss, zero], [zero, zero, zz]])
    for wires in layer.wires:
        n = np.array(turned(wires.direction, layer.rotation, azimuth))
        eps += np.multiply.outer(np.outer(n, n), wire_numbers(layer, wires, frequencies).local)
    if layer.mesh is not None:
        eps += np.multiply.outer(np.eye(3), wire_numbers(layer, layer.mesh, frequencies).local)
    return eps


def _local(layer: Layer, frequencies: np.ndarray, index2: np.ndarray, azimuth: float) -> Generator:
    found = Generator(2)
    eps, mu = local_tensor(layer, frequencies, azimuth), _tensor(layer, frequencies, azimuth, "mu")
    with np.errstate(divide="ignore", invalid="ignore"):  # at a lossless plasma edge: NaN points
        pz, sz = eps[0, 2] / eps[2, 2], eps[1, 2] / eps[2, 2]
        flat = (eps[0, 0] - eps[0, 2] * pz, eps[0, 1] - eps[0, 2] * sz, eps[1, 1] - eps[1, 2] * sz, eps[2, 2])
        _medium(found, flat, mu, index2)
    found.add("D", 0, 0, -pz, rows.SINE)
    found.add("D", 0, 1, -sz, rows.SINE)
    return found
