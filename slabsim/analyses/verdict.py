"""One sentence that says whether the local model of the wires will do, and why."""

from __future__ import annotations

from dataclasses import dataclass
from math import pi, sqrt

import numpy as np

from slabsim.constants import C0, TWO_PI
from slabsim.engine.generators import turned
from slabsim.engine.wire_numbers import direction_of, local_permittivity
from slabsim.stack.sample import ALONG_Z, Channel, Layer, Mesh, Stack, WireSet
from slabsim.units import format_spectral

_NEAR = 0.15  # how close, in units of pi, to a resonance a difference is blamed on it
_FLAT = 0.35  # |Re eps_zz|/eps_host up to which a difference is blamed on the plasma edge
_SMALL = 0.05  # share of the grid up to which the local model counts as good outside a region
_ROUND = 1e-12
_SAME = 1e-11  # difference of powers that is rounding
_THIN = 0.5  # electrical thickness kh d below which a layer of attached wires acts as a local one


def verdict(
    stack: Stack,
    channel: Channel,
    distance: np.ndarray,
    tolerance: float,
    quantity: str,
    azimuth_deg: float = 0.0,
) -> str:
    """Whether the local model agrees with the nonlocal one, in one sentence with its reason.

    Parameters
    ----------
    stack : Stack
    channel : {"TE", "TM", "TE_to_TM", "TM_to_TE"}
    distance : float array, shape (n_freqs, n_angles)
        Absolute difference of `quantity` between the models on the grid of the sweep.
    tolerance : float
    quantity : {"T", "R", "A"}
    azimuth_deg : float
        Of the plane of incidence [degrees].
    """
    layers = _wire_layers(stack, azimuth_deg)
    if not layers:
        return "No wires: the two models are the same."
    reasons = [layer.why_exact(stack, channel) for layer in layers]
    if all(reasons):
        return f"Local model exact: {' and '.join(dict.fromkeys(reasons))}."
    angles, unit = stack.sweep.angles_deg, stack.sweep.spectral_unit
    known = np.nan_to_num(distance)
    i, j = np.unravel_index(int(np.argmax(known)), known.shape)
    largest, f, angle = float(known[i, j]), float(stack.sweep.frequencies[i]), float(angles[j])
    if largest < _SAME:
        return f"Local model exact here: {quantity} of the two models agrees to rounding."
    differing = [layer for layer, reason in zip(layers, reasons, strict=True) if not reason]
    if largest <= tolerance:
        why = _why_it_holds(stack, differing)
        return f"Local model good enough: {quantity} differs by at most {largest:.2g}, {why}."
    share = float(np.mean(known > tolerance))
    grade = "not to be trusted" if share > _SMALL else "good outside a small region"
    where = f"at {format_spectral(f, unit, 4)}, {angle:g} deg"
    return (
        f"Local model {grade}: {quantity} is off by up to {largest:.2g} ({where}), "
        f"by more than {tolerance:g} on {100 * share:.3g} % of the grid; {_why_it_fails(differing, f, angle, stack)}."
    )


@dataclass(frozen=True)
class _WireLayer:
    """What the reasons need of one set of wires, or of a mesh, in its layer."""

    layer: Layer
    wires: WireSet | Mesh
    share_along: float  # of kt that runs along the wires

    @property
    def crosses_faces(self) -> bool:
        """Whether the wires end at the faces."""
        return direction_of(self.wires)[2] > 0.0

    def why_exact(self, stack: Stack, channel: Channel) -> str:
        """Why the models agree to the last digit for this set, or nothing."""
        at_normal = bool(np.all(stack.sweep.angles_deg == 0.0))
        if not self.crosses_faces:
            if at_normal or self.share_along < _ROUND:
                return "the wave has no wavenumber along the wires, which lie parallel to the faces"
            return ""
        if direction_of(self.wires) != ALONG_Z:
            return ""
        if at_normal:
            return "at normal incidence the field has no component along the wires that end at the faces"
        if channel == "TE" and not stack.mixes_polarizations:
            return "the TE field has no component along the wires that end at the faces"
        return ""

    def electrical_thickness(self, frequency: float) -> float:
        """kh times the length of the wires; of the layer, if they lie parallel to the faces."""
        index = sqrt(max(float(self.layer.material.permittivity(frequency).real), 0.0))
        length = self.layer.thickness / (direction_of(self.wires)[2] or 1.0)
        return TWO_PI * frequency / C0 * index * length

    def local_eps(self, frequency: float) -> float:
        """Re(eps) along the wires in the local model over that of the host: zero at the plasma edge."""
        f = np.array([frequency])
        eps = local_permittivity(self.layer, self.wires, f)[0].real
        return float(eps / abs(self.layer.material.permittivity(f)[0]))

    @property
    def is_attached(self) -> bool:
        """Whether both ends of the wires are held on a conductor without a load."""
        return self.crosses_faces and all(end.kind == "grounded" and end.load is None for end in self.wires.ends)

    @property
    def name(self) -> str:
        return f'"{self.layer.name}"' if self.layer.name else "the wire layer"


def _wire_layers(stack: Stack, azimuth_deg: float) -> list[_WireLayer]:
    found = []
    for layer in dict.fromkeys(e for e in stack.flatten() if isinstance(e, Layer)):
        sets: list[WireSet | Mesh] = [*layer.wires, *([layer.mesh] if layer.mesh else [])]
        for wires in sets:
            along = turned(direction_of(wires), layer.rotation, float(np.deg2rad(azimuth_deg)))[0]
            found.append(_WireLayer(layer, wires, abs(along)))
    return found


def _why_it_holds(stack: Stack, layers: list[_WireLayer]) -> str:
    top = float(stack.sweep.frequencies[-1])
    thickest = max(layer.electrical_thickness(top) for layer in layers)
    if all(layer.is_attached for layer in layers) and thickest < _THIN:
        return f"because the wires are attached at both ends and the layers are thin (kh d up to {thickest:.2g})"
    steepest = float(stack.sweep.angles_deg[-1])
    if steepest <= 30.0 and all(direction_of(layer.wires) == ALONG_Z for layer in layers):
        return f"because up to {steepest:g} deg the field along the wires is weak"
    return f"over this grid (kh d up to {thickest:.2g}); another thickness or range may differ"


def _why_it_fails(layers: list[_WireLayer], frequency: float, angle_deg: float, stack: Stack) -> str:
    crossing = [layer for layer in layers if layer.crosses_faces]
    for layer in crossing:
        order = layer.electrical_thickness(frequency) / pi
        is_mesh = isinstance(layer.wires, Mesh)
        if not is_mesh and round(order) >= 1 and abs(order - round(order)) < _NEAR:
            return (
                f"there the wires' TEM mode, which the local model lacks, resonates across {layer.name} "
                f"(kh d = {order:.2f} pi)"
            )
    if not crossing:
        layer = max(layers, key=lambda one: one.share_along)
        front = float(np.sqrt(stack.front.permittivity(frequency).real * stack.front.permeability(frequency).real))
        host = sqrt(abs(complex(layer.layer.material.permittivity(frequency))))
        share = front * np.sin(np.deg2rad(angle_deg)) * layer.share_along / host
        return (
            f"the permittivity along the wires of {layer.name} depends on the wavenumber along them "
            f"({share:.2f} of that in the host there), which the local model drops"
        )
    for layer in layers:
        if abs(layer.local_eps(frequency)) < _FLAT:
            return (
                f"there {layer.name} is near its plasma edge, where the local permittivity along the wires passes zero"
            )
    layer = max(crossing, key=lambda one: one.electrical_thickness(frequency))
    thickness = layer.electrical_thickness(frequency)
    if isinstance(layer.wires, Mesh):
        return f"{layer.name} has a longitudinal mode (kh d = {thickness:.2f}) that the local model lacks"
    if layer.local_eps(frequency) < 0.0:
        return (
            f"below the plasma edge the wires of {layer.name} carry a TEM mode (kh d = {thickness:.2f}) "
            "that the local model lacks"
        )
    return (
        f"above the plasma edge the permittivity along the wires of {layer.name} depends on the wavenumber along them "
        f"(kh d = {thickness:.2f}), but not in this model"
    )
