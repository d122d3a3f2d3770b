"""Elements that depend on frequency and angle in ways of their own: planes of wires, and metal plates.

Their numbers are computed here for every point of a sweep, with numpy; the kernels only put them into the stack. Beyond
the onset of diffraction, where one order tells half the truth, the points are marked.
"""

from __future__ import annotations

import numpy as np

from slabsim.constants import C0, ETA0, TWO_PI
from slabsim.engine.generators import cos_sin, turned
from slabsim.errors import InputError
from slabsim.materials.grids import diffracts, grid_impedance
from slabsim.materials.material import Material
from slabsim.materials.plates import Field, plate_edge, plates_diffract
from slabsim.materials.wires import internal_impedance
from slabsim.stack.sample import Grid, Plates

_SLANT = 1e-9  # sine of an angle to the plates below which incidence counts as along or across


def grid_impedances(
    grid: Grid,
    before: Material,
    after: Material,
    front: Material,
    frequencies: np.ndarray,
    angles_deg: np.ndarray,
    azimuth_deg: float,
) -> tuple[np.ndarray, np.ndarray]:
    """Normalised impedance of a plane of wires, and where it diffracts.

    Parameters
    ----------
    grid : Grid
    before, after, front : Material
        Media on its two sides, and that of incidence.
    frequencies, angles_deg : float arrays, shapes (n_freqs,), (n_angles,)
        [Hz], [degrees].
    azimuth_deg : float
        Of the plane of incidence [degrees].

    Returns
    -------
    z, diffracts : complex and bool array, shape (n_freqs, n_angles)
    """
    f = frequencies[:, None]
    k0, kt = TWO_PI * f / C0, _transverse(front, f, angles_deg)
    along, across, _ = turned(grid.direction, 0.0, float(np.deg2rad(azimuth_deg)))
    eps = before.permittivity(f), after.permittivity(f)
    mu = before.permeability(f), after.permeability(f)
    wire: np.ndarray | complex = 0.0
    if grid.metal is not None:
        host = 0.5 * (eps[0] + eps[1])
        wire = internal_impedance(grid.radius, grid.metal.permittivity(f), f, host) * grid.pitch / ETA0
    z = grid_impedance(grid.pitch, grid.radius, k0, kt * along, kt * across, eps, mu, wire)
    return z, diffracts(grid.pitch, k0, kt * along, kt * across, eps, mu) & np.ones(z.shape, dtype=bool)


def plate_ports(
    plates: Plates,
    front: Material,
    frequencies: np.ndarray,
    angles_deg: np.ndarray,
    azimuth_deg: float,
    y: np.ndarray,
) -> tuple[list[np.ndarray], np.ndarray]:
    """R and T of a layer of plates, for the field along and across the plane of incidence, and where they diffract.

    Parameters
    ----------
    plates : Plates
    front : Material
        Medium of incidence.
    frequencies, angles_deg : float arrays, shapes (n_freqs,), (n_angles,)
        [Hz], [degrees].
    azimuth_deg : float
        Of the plane of incidence, a multiple of 90 degrees.
    y : float array, shape (n_freqs,)
        Reference admittance of R and T.

    Returns
    -------
    ports : list of four complex arrays, shape (n_freqs, n_angles)
        R, T of p; R, T of s.
    diffracts : bool array, shape (2, n_freqs, n_angles)
        For TE (s) and TM (p).

    Raises
    ------
    InputError
        If the plane of incidence is neither along nor across the plates.

    Notes
    -----
    An edge is solved in the filling: between it and another medium outside stands a layer of the filling without
    thickness. The two edges do not see each other's evanescent modes.
    """
    is_along = incidence_along(plates, azimuth_deg)
    f = frequencies[:, None]
    k0, s = TWO_PI * f / C0, _transverse(front, f, angles_deg)
    eps, mu = plates.filling.permittivity(f), plates.filling.permeability(f)
    k2, kt, still = eps * mu * k0**2 + 0.0 * s, s * k0, 0.0 * s * k0
    kz = _root(eps * mu - s**2)
    p_line, s_line = (eps, kz, y[:, None]), (kz, mu, y[:, None])  # admittance, as a quotient, and the reference
    if is_along:  # Ep, with a factor exp(i kx x) along the plates; Es stands across them and does not see them
        whole = np.exp(1j * kz * k0 * plates.thickness)
        ports = [*_slab(k2 - kt**2, still, plates, "along", p_line), *_ports(0.0 * whole, whole, s_line)]
        marks = [plates_diffract(k2 - kt**2, still, plates.spacing, "along")] * 2
    else:
        ports = [*_slab(k2, kt, plates, "across", p_line), *_slab(k2, kt, plates, "along", s_line)]
        marks = [plates_diffract(k2, kt, plates.spacing, field) for field in ("along", "across")]
    return ports, np.array(marks)


def incidence_along(plates: Plates, azimuth_deg: float) -> bool:
    """Whether the plane of incidence runs along the plates; if not, across them.

    Raises
    ------
    InputError
        If it does neither.
    """
    c, s = cos_sin(float(np.deg2rad(azimuth_deg)))
    along, across = (c, s) if plates.normal == "y" else (s, c)
    if abs(across) < _SLANT:
        return True
    if abs(along) < _SLANT:
        return False
    raise InputError(
        f"azimuth = {azimuth_deg:g} deg with plates normal to {plates.normal}: the reflection of their edge is known "
        "for planes of incidence along and across the plates; use a multiple of 90 deg"
    )


def _transverse(front: Material, f: np.ndarray, angles_deg: np.ndarray) -> np.ndarray:
    """kt/k0, shape (n_freqs, n_angles)."""
    index = np.sqrt(front.permittivity(f).real * front.permeability(f).real)
    return index * np.sin(np.deg2rad(angles_deg))


_Line = tuple[np.ndarray, np.ndarray, np.ndarray]


def _slab(k2: np.ndarray, ky: np.ndarray, plates: Plates, field: Field, line: _Line) -> tuple[np.ndarray, np.ndarray]:
    """R, T of a layer of plates for one direction of the field."""
    edge = plate_edge(k2, ky, plates.spacing, field)
    total = edge.outside + edge.inside
    step = (edge.outside - edge.inside) / total
    outside, inside = step * edge.phase_outside, -step * edge.phase_inside
    through = 4.0 * edge.outside * edge.inside / total**2 * edge.phase_outside * edge.phase_inside
    pass_by = np.exp(1j * edge.inside * plates.thickness)
    loop = 1.0 - (inside * pass_by) ** 2
    r, t = outside + through * inside * pass_by**2 / loop, through * pass_by / loop
    return _ports(-r if field == "across" else r, t, line)  # across: r is that of the magnetic field


def _ports(r: np.ndarray, t: np.ndarray, line: _Line) -> tuple[np.ndarray, np.ndarray]:
    """R, T of a mirror-symmetric layer between lines of the reference admittance, from those in its own filling."""
    above, below, y = line
    parts = []
    for total in (r + t, r - t):  # even and odd
        outward, inward = y * below * (1.0 + total), above * (1.0 - total)
        parts.append((outward - inward) / (outward + inward))
    return 0.5 * (parts[0] + parts[1]), 0.5 * (parts[0] - parts[1])


def _root(z: np.ndarray) -> np.ndarray:
    root = np.sqrt(z + 0j)
    return np.where(root.imag < 0.0, -root, root)
