"""Whether the materials can be what the file says, over the frequencies of the sweep."""

import numpy as np

from slabsim.errors import InputError, MaterialError
from slabsim.materials.material import PASSIVE, Material
from slabsim.materials.wires import plasma_wavenumber
from slabsim.stack.file_wires import MeshTable, WireTable
from slabsim.units import format_spectral

_ROUNDING = 1e-14
_AXES = ((0, "_xx"), (1, "_yy"), (2, "_zz"))


def material_fault(material: Material, frequencies: np.ndarray, unit: str) -> str | None:
    """Why `material` cannot be used at `frequencies` [Hz], or None; `unit` is the sweep's own."""
    try:
        eps, mu = material.permittivity_axes(frequencies), material.permeability_axes(frequencies)
    except MaterialError as error:
        first, last = (format_spectral(frequencies[end], unit) for end in (0, -1))
        return f"{error}; the sweep goes from {first} to {last}: narrow it or extend the data"
    axes = [(f"{symbol}{axis}", values[k]) for symbol, values in (("eps", eps), ("mu", mu)) for k, axis in _AXES]
    for symbol, values in [("eps", eps[0]), ("mu", mu[0])] if material.is_isotropic else axes:
        at = _first(frequencies, ~np.isfinite(values), unit)
        if at:
            return f"{symbol} is not finite at {at}, a pole of its formula; add damping or move the sweep point"
        at = _first(frequencies, values.imag < -_ROUNDING * abs(values), unit)
        if at:
            return f"Im({symbol}) < 0 at {at}: the material would amplify; {PASSIVE}"
        at = _first(frequencies, values == 0.0, unit)
        if at:
            return f"{symbol} = 0 exactly at {at}; add loss or move the sweep point"
    return None


def front_fault(material: Material, frequencies: np.ndarray, unit: str) -> str | None:
    """Why a wave cannot come in through `material`, or None."""
    eps, mu = material.permittivity(frequencies), material.permeability(frequencies)
    allowed = "the front half-space must be lossless with eps > 0 and mu > 0"
    at = _first(frequencies, (eps.imag != 0.0) | (mu.imag != 0.0), unit)
    if at:
        return f'"{material.name}" is lossy at {at}; {allowed}'
    at = _first(frequencies, (eps.real <= 0.0) | (mu.real <= 0.0), unit)
    return f'"{material.name}" has eps <= 0 or mu <= 0 at {at}; {allowed}' if at else None


def isotropy_fault(material: Material, what: str) -> str | None:
    """Why `what` cannot be made of `material`, or None."""
    if material.is_isotropic:
        return None
    return f'"{material.name}" is anisotropic; {what} must be isotropic: give one permittivity and permeability'


def metal_fault(metal: Material, host: Material | None, frequencies: np.ndarray, unit: str) -> str | None:
    """Why wires in `host` (None: between two media) cannot be made of `metal`, or None."""
    if metal.is_magnetic:
        return f'"{metal.name}" is magnetic; the metal of wires must have permeability 1'
    if host is None or not metal.is_isotropic:
        return isotropy_fault(metal, "the metal of wires")
    at = _first(frequencies, metal.permittivity(frequencies) == host.permittivity(frequencies), unit)
    return f'"{metal.name}" has the permittivity of its host at {at}: there are no wires; name a metal' if at else None


def lattice_fault(wires: WireTable | MeshTable, host: Material) -> str | None:
    """Why the plasma wavenumber of `wires` in `host` cannot be had, or None."""
    try:
        plasma_wavenumber(wires.cell, wires.radius, wires.plasma, host)
    except (InputError, MaterialError) as error:
        return str(error)
    return None


def _first(frequencies: np.ndarray, fails: np.ndarray, unit: str) -> str:
    return format_spectral(float(frequencies[fails][0]), unit) if np.any(fails) else ""
