"""Do two models of the wires predict the same slab?

The models are run on the grid of the sweep; their difference is summed up per polarization and angle, over the
regions of (frequency, angle) where it exceeds a tolerance, and in one sentence with a reason. The first model is the
one that is trusted.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from slabsim.analyses.passbands import Band, BandList, Level, default_quantity, find_bands
from slabsim.analyses.spectra import Quantity
from slabsim.analyses.tracking import pair_bands
from slabsim.analyses.verdict import verdict
from slabsim.engine.response import Response, Solver
from slabsim.errors import InputError
from slabsim.stack.sample import Channel, Model, Stack

MODELS: tuple[Model, ...] = ("nonlocal", "local")
TOLERANCE = 0.01  # in T
NOTHING = 1e-12  # power that counts as none
Angles = Sequence[float] | np.ndarray | None


@dataclass(frozen=True)
class AngleSummary:
    """Difference of the two models at one polarization and angle, over the frequencies of the sweep."""

    polarization: Channel
    angle_deg: float
    largest: float
    largest_at: float
    mean: float


@dataclass(frozen=True)
class Region:
    """A connected region of the grid where the models differ by more than the tolerance."""

    polarization: Channel
    frequencies: tuple[float, float]
    angles_deg: tuple[float, float]
    largest: float
    largest_at: tuple[float, float]
    share: float


@dataclass(frozen=True)
class EdgePair:
    """One pass band in both models at one polarization and angle; None where a model does not have it."""

    polarization: Channel
    angle_deg: float
    trusted: Band | None
    other: Band | None


@dataclass(frozen=True)
class Comparison:
    """Everything that `compare_models` found.

    Attributes
    ----------
    models : (str, str)
        Trusted model, other model.
    quantity : {"T", "R", "A"}
    tolerance : float
    frequencies, angles_deg : float arrays, shape (n_freqs,), (n_angles,)
    channels : tuple of {"TE", "TM", "TE_to_TM", "TM_to_TE"}
        First axis of the powers; of absorptances the incident polarizations.
    azimuth_deg : float
        Of the plane of incidence [degrees].
    powers : tuple of float array, shape (n_channels, n_freqs, n_angles)
        The quantity in each of the two models.
    angles : tuple of AngleSummary
    regions : tuple of Region
        Widest first.
    bands : tuple of EdgePair
    levels : tuple of BandList
        Band lists of both models, with their levels.
    verdicts : dict of str to str
        One sentence per channel; none for a cross term that is zero throughout.
    """

    models: tuple[Model, Model]
    quantity: Quantity
    tolerance: float
    frequencies: np.ndarray
    angles_deg: np.ndarray
    channels: tuple[Channel, ...]
    azimuth_deg: float
    powers: tuple[np.ndarray, np.ndarray]
    angles: tuple[AngleSummary, ...]
    regions: tuple[Region, ...]
    bands: tuple[EdgePair, ...]
    levels: tuple[BandList, ...]
    verdicts: dict[Channel, str]

    @property
    def difference(self) -> np.ndarray:
        """Other model minus trusted model, shape (n_channels, n_freqs, n_angles)."""
        return self.powers[1] - self.powers[0]


def compare_models(
    stack: Stack,
    models: tuple[Model, Model] = ("nonlocal", "local"),
    tolerance: float = TOLERANCE,
    angles_deg: Angles = None,
    level: Level | None = None,
    azimuth_deg: float | None = None,
) -> Comparison:
    """Compare two models of the wires over the sweep of a stack.

    Parameters
    ----------
    stack : Stack
    models : (str, str)
        The model that is trusted, and the one in question.
    tolerance : float
        Largest difference of the power that counts as agreement.
    angles_deg : sequence of float, optional
        Angles at which pass bands are solved [degrees]; default: all of the sweep.
    level : Level, optional
        Of the pass bands; default: half of the peak.
    azimuth_deg : float, optional
        Of the plane of incidence [degrees]; default: the first of the sweep.

    Returns
    -------
    Comparison

    Raises
    ------
    InputError
        If the tolerance is not between 0 and 1.
    """
    if not 0.0 < tolerance < 1.0:
        raise InputError(f"tolerance = {tolerance}; it must lie between 0 and 1")
    sweep, quantity = stack.sweep, default_quantity(stack)
    azimuth = float(sweep.azimuths_deg[0]) if azimuth_deg is None else azimuth_deg
    responses = [Solver(stack, model).solve(sweep.frequencies, sweep.angles_deg, azimuth) for model in models]
    channels: tuple[Channel, ...] = responses[0].incident if quantity == "A" else responses[0].channels
    trusted, other = (_power(response, quantity) for response in responses)
    distance = abs(other - trusted)
    lists = [_bands(stack, model, angles_deg, level, azimuth) for model in models]
    regions = tuple(
        region for p, channel in enumerate(channels) for region in _regions(distance[p], channel, stack, tolerance)
    )
    return Comparison(
        models=models,
        quantity=quantity,
        tolerance=tolerance,
        frequencies=sweep.frequencies,
        angles_deg=sweep.angles_deg,
        channels=channels,
        azimuth_deg=azimuth,
        powers=(trusted, other),
        angles=tuple(_summaries(distance, channels, stack)),
        regions=regions,
        bands=tuple(_edge_pairs(*lists)),
        levels=tuple(lists[0] + lists[1]),
        verdicts={
            channel: verdict(stack, channel, distance[p], tolerance, quantity, azimuth)
            for p, channel in enumerate(channels)
            if channel in sweep.polarizations or np.nanmax(trusted[p] + other[p], initial=0.0) > NOTHING
        },
    )


def _power(response: Response, quantity: Quantity) -> np.ndarray:
    power = getattr(response, quantity)
    assert isinstance(power, np.ndarray)
    return power


def _bands(stack: Stack, model: Model, angles_deg: Angles, level: Level | None, azimuth: float) -> list[BandList]:
    if stack.sweep.frequencies.size < 2:
        return []
    return find_bands(stack, angles_deg, level, model=model, azimuths_deg=[azimuth])


def _summaries(distance: np.ndarray, channels: tuple[Channel, ...], stack: Stack) -> Iterator[AngleSummary]:
    frequencies = stack.sweep.frequencies
    for p, channel in enumerate(channels):
        for a, angle in enumerate(stack.sweep.angles_deg):
            column = np.nan_to_num(distance[p, :, a])
            worst = int(np.argmax(column))
            yield AngleSummary(
                channel, float(angle), float(column[worst]), float(frequencies[worst]), float(column.mean())
            )


def _regions(distance: np.ndarray, channel: Channel, stack: Stack, tolerance: float) -> list[Region]:
    from scipy.ndimage import find_objects, label

    f, angles = stack.sweep.frequencies, stack.sweep.angles_deg
    marks, _ = label(distance > tolerance)
    regions = []
    for number, (rows, columns) in enumerate(find_objects(marks), start=1):
        inside = np.where(marks[rows, columns] == number, distance[rows, columns], 0.0)
        i, j = np.unravel_index(int(np.argmax(inside)), inside.shape)
        regions.append(
            Region(
                polarization=channel,
                frequencies=(float(f[rows.start]), float(f[rows.stop - 1])),
                angles_deg=(float(angles[columns.start]), float(angles[columns.stop - 1])),
                largest=float(inside[i, j]),
                largest_at=(float(f[rows.start + i]), float(angles[columns.start + j])),
                share=float(np.count_nonzero(inside) / distance.size),
            )
        )
    return sorted(regions, key=lambda region: -region.share)


def _edge_pairs(trusted: list[BandList], other: list[BandList]) -> list[EdgePair]:
    return [
        EdgePair(one.polarization, one.angle_deg, a, b)
        for one, two in zip(trusted, other, strict=True)
        for a, b in pair_bands(one.bands, two.bands)
    ]
