"""One sentence that says whether the local model of the wires will do, and why."""

from __future__ import annotations

from dataclasses import dataclass
from math import pi, sqrt

import numpy as np

from slabsim.constants import C0, TWO_PI
from slabsim.engine.pack import local_permittivity
from slabsim.stack.sample import Layer, Polarization, Stack, WireSet
from slabsim.units import format_frequency

_NEAR = 0.15  # how close, in units of pi, to a resonance a difference is blamed on it
_FLAT = 0.35  # |Re eps_zz|/eps_host up to which a difference is blamed on the plasma edge
_SMALL = 0.05  # share of the grid up to which the local model counts as good outside a region
_THIN = 0.5  # electrical thickness kh d below which a layer of attached wires acts as a local one


def verdict(stack: Stack, polarization: Polarization, distance: np.ndarray, tolerance: float, quantity: str) -> str:
    """Whether the local model agrees with the nonlocal one, in one sentence with its reason.

    Parameters
    ----------
    stack : Stack
    polarization : {"TE", "TM"}
    distance : float array, shape (n_freqs, n_angles)
        Absolute difference of `quantity` between the models on the grid of the sweep.
    tolerance : float
    quantity : {"T", "R", "A"}
    """
    layers = _wire_layers(stack)
    if not layers:
        return "No wires: the two models are the same."
    if polarization == "TE":
        return "Local model exact: the TE field has no component along the wires, which it does not see."
    angles = stack.sweep.angles_deg
    if np.all(angles == 0.0):
        return "Local model exact: at normal incidence the field has no component along the wires."
    known = np.nan_to_num(distance)
    i, j = np.unravel_index(int(np.argmax(known)), known.shape)
    largest, f, angle = float(known[i, j]), float(stack.sweep.frequencies[i]), float(angles[j])
    if largest <= tolerance:
        return f"Local model good enough: {quantity} differs by at most {largest:.2g}, {_why_it_holds(stack, layers)}."
    share = float(np.mean(known > tolerance))
    grade = "not to be trusted" if share > _SMALL else "good outside a small region"
    return (
        f"Local model {grade}: {quantity} is off by up to {largest:.2g} (at {format_frequency(f, 4)}, {angle:g} deg), "
        f"by more than {tolerance:g} on {100 * share:.3g} % of the grid; {_why_it_fails(layers, f)}."
    )


@dataclass(frozen=True)
class _WireLayer:
    """What the reasons need of one wire layer."""

    layer: Layer
    wires: WireSet

    def electrical_thickness(self, frequency: float) -> float:
        """kh d."""
        index = sqrt(max(float(self.layer.material.permittivity(frequency).real), 0.0))
        return TWO_PI * frequency / C0 * index * self.layer.thickness

    def local_eps(self, frequency: float) -> float:
        """Re(eps_zz) of the local model over that of the host: zero at the plasma edge."""
        f = np.array([frequency])
        eps = local_permittivity(self.layer, self.wires, f)[0].real
        return float(eps / abs(self.layer.material.permittivity(f)[0]))

    @property
    def is_attached(self) -> bool:
        """Whether both ends of the wires are held on a conductor without a load."""
        return all(end.kind == "grounded" and end.load is None for end in self.wires.ends)

    @property
    def name(self) -> str:
        return f'"{self.layer.name}"' if self.layer.name else "the wire layer"


def _wire_layers(stack: Stack) -> list[_WireLayer]:
    layers = dict.fromkeys(e for e in stack.flatten() if isinstance(e, Layer) and e.wires is not None)
    return [_WireLayer(layer, layer.wires) for layer in layers if layer.wires is not None]


def _why_it_holds(stack: Stack, layers: list[_WireLayer]) -> str:
    top = float(stack.sweep.frequencies[-1])
    thickest = max(layer.electrical_thickness(top) for layer in layers)
    if all(layer.is_attached for layer in layers) and thickest < _THIN:
        return f"because the wires are attached at both ends and the layers are thin (kh d up to {thickest:.2g})"
    steepest = float(stack.sweep.angles_deg[-1])
    if steepest <= 30.0:
        return f"because up to {steepest:g} deg the field along the wires is weak"
    return f"over this grid (kh d up to {thickest:.2g}); another thickness or range may differ"


def _why_it_fails(layers: list[_WireLayer], frequency: float) -> str:
    for layer in layers:
        order = layer.electrical_thickness(frequency) / pi
        if round(order) >= 1 and abs(order - round(order)) < _NEAR:
            return (
                f"there the wires' TEM mode, which the local model lacks, resonates across {layer.name} "
                f"(kh d = {order:.2f} pi)"
            )
    for layer in layers:
        if abs(layer.local_eps(frequency)) < _FLAT:
            return f"there {layer.name} is near its plasma edge, where the local eps_zz passes zero"
    layer = max(layers, key=lambda one: one.electrical_thickness(frequency))
    thickness = layer.electrical_thickness(frequency)
    if layer.local_eps(frequency) < 0.0:
        return (
            f"below the plasma edge the wires of {layer.name} carry a TEM mode (kh d = {thickness:.2f}) "
            "that the local model lacks"
        )
    return f"above the plasma edge eps_zz of {layer.name} depends on kz (kh d = {thickness:.2f}), but not in this model"
