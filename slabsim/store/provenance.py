"""What produced the numbers of a map: program versions, models and formulas."""

from __future__ import annotations

import platform
from dataclasses import dataclass, field
from importlib.metadata import PackageNotFoundError, version
from typing import TYPE_CHECKING

import slabsim
from slabsim.stack.sample import Grid, Layer, Plates
from slabsim.store import layout

if TYPE_CHECKING:
    from slabsim.stack.sample import Mesh, Stack, WireSet

_PACKAGES = ("numpy", "scipy", "numba", "h5py")


@dataclass(frozen=True)
class Provenance:
    """What produced the numbers of a map.

    Parameters
    ----------
    version : str
        Version of slabsim.
    environment : dict of str to str
        Versions of everything else that takes part.
    models : dict of str to str
        Which models and formulas were used.
    """

    version: str
    environment: dict[str, str] = field(default_factory=dict)
    models: dict[str, str] = field(default_factory=dict)

    @classmethod
    def of(cls, stack: Stack) -> Provenance:
        """Provenance of a run of this program, here and now."""
        return cls(slabsim.__version__, _environment(), _models(stack))


def _environment() -> dict[str, str]:
    found = {"python": platform.python_version(), "platform": platform.platform()}
    for package in _PACKAGES:
        try:
            found[package] = version(package)
        except PackageNotFoundError:
            found[package] = "unknown"
    return found


def _models(stack: Stack) -> dict[str, str]:
    elements = stack.flatten()
    layers = [element for element in elements if isinstance(element, Layer)]
    wires: list[WireSet | Mesh] = [one for layer in layers for one in layer.wires]
    wires += [layer.mesh for layer in layers if layer.mesh is not None]
    formulas = sorted({_plasma_formula(wire_set) for wire_set in wires})
    found = {
        "wire_medium": stack.sweep.model,
        "plasma_wavenumber": ", ".join(formulas) or "no wires",
        "power": "flux ratios along z; absorptance = 1 - reflectance - transmittance",
        "time_convention": layout.TIME_CONVENTION,
    }
    if any(layer.mesh is not None and layer.mesh.stiffness is None for layer in layers):
        found["mesh_stiffness"] = "l0 = 3/(1 + 2 kp^2/beta^2), uniform line charges on three sets"
    if any(isinstance(element, Grid) for element in elements):
        found["grid"] = "lattice sum over diffraction orders, zero order, thin wires"
    if any(isinstance(element, Plates) for element in elements):
        found["plates"] = "edge of Carlson and Heins (1947), one mode between the plates"
    return found


def _plasma_formula(wires: WireSet | Mesh) -> str:
    if isinstance(wires.plasma, str):
        return wires.plasma
    return f"given plasma frequency {wires.plasma:.12g} Hz"
