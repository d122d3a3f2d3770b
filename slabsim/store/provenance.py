"""What produced the numbers of a map: program versions, models and formulas."""

from __future__ import annotations

import platform
from dataclasses import dataclass, field
from importlib.metadata import PackageNotFoundError, version
from typing import TYPE_CHECKING

import slabsim
from slabsim.stack.sample import Layer
from slabsim.store import layout

if TYPE_CHECKING:
    from slabsim.stack.sample import Stack, WireSet

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
    wires = [e.wires for e in stack.flatten() if isinstance(e, Layer) and e.wires is not None]
    formulas = sorted({_plasma_formula(wire_set) for wire_set in wires})
    return {
        "wire_medium": stack.sweep.model,
        "plasma_wavenumber": ", ".join(formulas) or "no wires",
        "power": "flux ratios along z; absorptance = 1 - reflectance - transmittance",
        "time_convention": layout.TIME_CONVENTION,
    }


def _plasma_formula(wires: WireSet) -> str:
    if isinstance(wires.plasma, str):
        return wires.plasma
    return f"given plasma frequency {wires.plasma:.12g} Hz"
