"""What the equations of a set of wires need at each frequency: kp, zeta, inductance, charge; and what its ends do.

    (n.grad) phi = -xi w + n.E            xi = zeta - i k0 m/kp^2
    (n.grad) w   = i k0 eps_h kp^2 phi    with zc = i zeta kp^2/k0:  xi = -i (k0/kp^2)(m + zc)

m is the permeability that the magnetic field around the wires meets, eps_h the permittivity that their electric field
across the wires meets; in an anisotropic host the geometric mean over the plane across the wires.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from slabsim.constants import C0, ETA0, TWO_PI
from slabsim.materials.wires import internal_impedance, plasma_wavenumber
from slabsim.stack.sample import ALONG_Z, Direction, Layer, Mesh, SeriesLoad, WireSet


@dataclass(frozen=True)
class WireNumbers:
    """One set of wires in its layer, complex arrays of shape (n_freqs,) unless stated.

    Attributes
    ----------
    kp : float
        Plasma wavenumber [rad/m].
    kappa_p : float array
        kp/k0.
    zeta : complex array
        Zw area/eta0 [m], Zw the internal impedance per length.
    zc : complex array
        i zeta kp^2/k0.
    inductance, charge : complex arrays
        m and eps_h.
    area : float
        Of the cell across the wires [m^2].
    """

    kp: float
    kappa_p: np.ndarray
    zeta: np.ndarray
    zc: np.ndarray
    inductance: np.ndarray
    charge: np.ndarray
    area: float

    @property
    def local(self) -> np.ndarray:
        """g = i/(k0 xi): what the wires add to the permittivity along them in the local model."""
        return -(self.kappa_p**2) / (self.inductance + self.zc)


def wire_numbers(layer: Layer, wires: WireSet | Mesh, frequencies: np.ndarray) -> WireNumbers:
    """Numbers of one set of wires, or of one of the three sets of a mesh, in its layer at `frequencies` [Hz].

    Raises
    ------
    MaterialError
        If a material is not known at one of the frequencies.
    """
    k0 = TWO_PI * frequencies / C0
    kp, zeta = wire_constants(layer, wires, frequencies)
    n = direction_of(wires)
    inductance = np.ones(frequencies.shape, dtype=complex)
    if wires.inductance == "host":
        inductance = _across(layer.material.permeability_axes(frequencies), n)
    charge = _across(layer.material.permittivity_axes(frequencies), n)
    return WireNumbers(kp, kp / k0, zeta, 1j * zeta * kp**2 / k0, inductance, charge, cell_area(wires))


def wire_constants(layer: Layer, wires: WireSet | Mesh, frequencies: np.ndarray) -> tuple[float, np.ndarray]:
    """Plasma wavenumber kp [rad/m] of a set of wires, and its zeta = Zw area/eta0 [m], shape (n_freqs,)."""
    kp = plasma_wavenumber(wires.pitch, wires.radius, wires.plasma, layer.material)
    if wires.metal is None:
        return kp, np.zeros(frequencies.shape, dtype=complex)
    metal = wires.metal.permittivity(frequencies)
    host = _along(layer.material.permittivity_axes(frequencies), direction_of(wires))
    return kp, internal_impedance(wires.radius, metal, frequencies, host) * cell_area(wires) / ETA0


def local_permittivity(layer: Layer, wires: WireSet | Mesh, frequencies: np.ndarray) -> np.ndarray:
    """Permittivity along the wires in the local model, eps + i/(k0 xi), complex array of shape (n_freqs,).

    Zero at the plasma edge; where the wires are inductive by themselves that lies below the edge given by kp alone.
    """
    host = _along(layer.material.permittivity_axes(frequencies), direction_of(wires))
    return host + wire_numbers(layer, wires, frequencies).local


def direction_of(wires: WireSet | Mesh) -> Direction:
    """Unit vector along the wires that end at the faces."""
    return wires.direction if isinstance(wires, WireSet) else ALONG_Z


def cell_area(wires: WireSet | Mesh) -> float:
    """Area [m^2] of the cell across one set of wires."""
    p, q = wires.pitch if isinstance(wires, WireSet) else (wires.pitch, wires.pitch)
    return p * q


def load_impedance(load: SeriesLoad, frequencies: np.ndarray) -> np.ndarray:
    """Impedance [ohm] of a series load; time factor exp(-i w t), so an inductance is -i w L."""
    w = TWO_PI * frequencies
    z = load.resistance - 1j * w * load.inductance
    return z if load.capacitance is None else z + 1j / (w * load.capacitance)


def _along(axes: np.ndarray, n: Direction) -> np.ndarray:
    if n == ALONG_Z:
        return axes[2]
    return sum(component**2 * one for component, one in zip(n, axes, strict=True))


def _across(axes: np.ndarray, n: Direction) -> np.ndarray:
    x, y, z = axes
    if np.array_equal(x, y) and (n == ALONG_Z or np.array_equal(x, z)):
        return x
    # the determinant over the plane across n is a product of two numbers with Im >= 0, and so its root has Im >= 0; if
    # both are real and negative, so is the root
    root = np.sqrt(n[0] ** 2 * y * z + n[1] ** 2 * x * z + n[2] ** 2 * x * y)
    trace = x + y + z - _along(axes, n)
    flips = (root.imag < 0.0) | ((root.imag == 0.0) & (trace.real < 0.0))
    return np.where(flips, -root, root)
