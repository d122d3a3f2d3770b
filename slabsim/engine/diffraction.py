"""Up to which frequency planes of wires and metal plates send waves into one direction only."""

from __future__ import annotations

import numpy as np

from slabsim.constants import C0
from slabsim.engine.pack import neighbours
from slabsim.engine.point_rows import incidence_along
from slabsim.materials.material import Material
from slabsim.stack.sample import Grid, Plates, Stack


def onset(stack: Stack, angles_deg: np.ndarray, azimuth_deg: float = 0.0) -> np.ndarray:
    """Lowest frequency at which a grid or a layer of plates diffracts; beyond it their points are NaN.

    Parameters
    ----------
    stack : Stack
    angles_deg : float array, shape (n_angles,)
        Of incidence [degrees].
    azimuth_deg : float
        Of the plane of incidence [degrees].

    Returns
    -------
    float array, shape (n_angles,)
        [Hz]; infinite without such elements. Dispersive media count as at the middle of the sweep.

    Notes
    -----
    An order m = -1 with transverse wavenumber ky - 2 pi/a propagates where n^2 k0^2 >= kx^2 + (ky - 2 pi/a)^2
    (grating equation, textbook).
    """
    angles_deg = np.atleast_1d(np.asarray(angles_deg, dtype=float))
    middle = stack.sweep.frequencies[stack.sweep.frequencies.size // 2]
    sine = _index(stack.front, middle) * np.sin(np.deg2rad(angles_deg))
    lowest = np.full(angles_deg.shape, np.inf)
    elements = stack.flatten()
    for position, element in enumerate(elements):
        if isinstance(element, Grid):
            p = np.deg2rad(azimuth_deg)
            along = element.direction[0] * np.cos(p) + element.direction[1] * np.sin(p)
            index = max(_index(side, middle) for side in neighbours(elements, position, stack))
            lowest = np.minimum(
                lowest, _grating(element.pitch, index, sine * along, sine * np.sqrt(max(1.0 - along**2, 0.0)))
            )
        elif isinstance(element, Plates):
            index = _index(element.filling, middle)
            if incidence_along(element, azimuth_deg):
                found = _grating(element.spacing, index, sine, 0.0 * sine)
            else:  # TM excites a second mode between the plates before a second order outside
                found = _grating(element.spacing, index, 0.0 * sine, sine)
                second_mode = np.where(sine > 0.0, C0 / (2.0 * element.spacing * index), np.inf)
                found = np.minimum(found, second_mode)
            lowest = np.minimum(lowest, found)
    return lowest


def _index(material: Material, frequency: float) -> float:
    eps, mu = material.permittivity(frequency), material.permeability(frequency)
    return float(np.sqrt(max((eps * mu).real, 0.0)))


def _grating(pitch: float, index: float, along: np.ndarray, across: np.ndarray) -> np.ndarray:
    """c/(pitch (sqrt(n^2 - along^2) + across)); infinite where even that is evanescent."""
    reach = np.sqrt(np.maximum(index**2 - along**2, 0.0)) + abs(across)
    with np.errstate(divide="ignore"):
        return np.where(reach > abs(across), C0 / (pitch * reach), np.inf)
