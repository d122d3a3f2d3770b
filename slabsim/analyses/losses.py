"""Where the incident power goes at one point: out in every channel, and into each layer and set of wires."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from slabsim.engine.fields import Loss, losses
from slabsim.engine.response import Response, Solver
from slabsim.errors import InputError
from slabsim.stack.sample import Model, Polarization, Stack


@dataclass(frozen=True)
class PowerBudget:
    """Shares of the incident power at one frequency and direction.

    Attributes
    ----------
    frequency, angle_deg, azimuth_deg : float
        [Hz], [degrees].
    model : {"nonlocal", "local"}
    polarizations : tuple of {"TE", "TM"}
        Of the incident wave; the columns of all shares.
    channels : tuple of (str, tuple of float)
        What is reflected and transmitted, "reflected", "reflected as TM" ...; NaN where a channel is not there.
    losses : tuple of Loss
        What each element absorbs, and after it the metal of its sets of wires.
    """

    frequency: float
    angle_deg: float
    azimuth_deg: float
    model: Model
    polarizations: tuple[Polarization, ...]
    channels: tuple[tuple[str, tuple[float, ...]], ...]
    losses: tuple[Loss, ...]

    @property
    def totals(self) -> tuple[float, ...]:
        """Sum of all channels and of the losses of whole elements: 1 but for rounding."""
        rows = [shares for _, shares in self.channels] + [one.shares for one in self.losses if not one.part]
        return tuple(float(total) for total in np.sum(rows, axis=0))


def power_budget(
    stack: Stack, frequency: float, angle_deg: float, azimuth_deg: float | None = None, model: Model | None = None
) -> PowerBudget:
    """Where the incident power goes.

    Parameters
    ----------
    stack : Stack
    frequency : float
        [Hz].
    angle_deg : float
        Of incidence [degrees].
    azimuth_deg : float, optional
        Of the plane of incidence [degrees]; default: the first of the sweep.
    model : {"nonlocal", "local"}, optional
        Default: that of the sweep.

    Raises
    ------
    InputError
        If an argument is out of bounds, or the point lies beyond the onset of diffraction of a grid or of plates.
    """
    azimuth = float(stack.sweep.azimuths_deg[0]) if azimuth_deg is None else azimuth_deg
    solver = Solver(stack, model)
    response = solver.solve(frequency, angle_deg, azimuth)
    if not np.all(np.isfinite(response.R)):
        raise InputError(
            f"frequency = {frequency:g} Hz, angle = {angle_deg:g} deg: no solution here; the point lies on a pole of a "
            "material, or beyond the onset of diffraction of a grid or of plates (describe prints it)"
        )
    found = losses(stack, frequency, angle_deg, azimuth, solver.model)
    channels = tuple(_channels(response))
    return PowerBudget(frequency, angle_deg, azimuth, solver.model, solver.polarizations, channels, tuple(found))


def _channels(response: Response) -> list[tuple[str, tuple[float, ...]]]:
    n = len(response.incident)
    found = []
    for word, powers in (("reflected", response.R), ("transmitted", response.T)):
        if powers is not None:
            values = powers[:, 0, 0]
            found.append((word, tuple(float(v) for v in values[:n])))
            if values.size > n:
                found.append((f"{word}, other polarization", tuple(float(v) for v in values[n:])))
    return found
