"""Pass bands: where the transmittance stays above a level, with edges solved on the engine.

The grid of the sweep is only the start: `spectra.fine_spectrum` adds the samples that show every resonance, each
crossing of the level is then bracketed, and its root is found on the engine to `EDGE_TOLERANCE`.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from slabsim.analyses.spectra import Line, Quantity, fine_spectrum
from slabsim.engine.response import Solver
from slabsim.errors import InputError
from slabsim.stack.sample import Channel, Model, Stack

EDGE_TOLERANCE = 1e-12  # relative, of band edges; a band narrower than this cannot be resolved and is left out
_NOISE = 1e-9  # relative height below which a maximum is rounding
SKIRT = 0.1  # the shape factor compares the widths at the level and at this part of it


@dataclass(frozen=True)
class Level:
    """What counts as passing: `value`, absolute or as a part of the spectrum's peak."""

    value: float = 0.5
    of_peak: bool = True

    def absolute(self, peak: float) -> float:
        """The level as an absolute power."""
        return self.value * peak if self.of_peak else self.value


@dataclass(frozen=True)
class Band:
    """One pass band.

    Attributes
    ----------
    lower, upper : float
        Edges [Hz]; the end of the sweep where the band is cut.
    cut_below, cut_above : bool
        The band goes on beyond the end of the sweep.
    peak, peak_frequency : float
        Largest power within the band and its place [Hz].
    ripple_db : float
        From the highest maximum to the lowest minimum between the outermost maxima [dB]; 0 with one maximum.
    shape_factor : float
        Width at the skirt level over width at the level; NaN where the skirt is not reached before the end
        of the sweep or before the next band.
    """

    lower: float
    upper: float
    cut_below: bool
    cut_above: bool
    peak: float
    peak_frequency: float
    ripple_db: float
    shape_factor: float

    @property
    def centre(self) -> float:
        """Mid-point of the edges [Hz]."""
        return 0.5 * (self.lower + self.upper)

    @property
    def width(self) -> float:
        """Distance of the edges [Hz]."""
        return self.upper - self.lower

    @property
    def fractional_width(self) -> float:
        """Width over centre."""
        return self.width / self.centre

    @property
    def insertion_loss_db(self) -> float:
        """Loss at the peak [dB], positive."""
        return float(-10.0 * np.log10(self.peak))


@dataclass(frozen=True)
class BandList:
    """All pass bands of one channel, angle and azimuth, ascending, and the level they were found at."""

    polarization: Channel
    angle_deg: float
    quantity: Quantity
    level: float
    skirt_level: float
    peak: float
    bands: tuple[Band, ...]
    azimuth_deg: float = 0.0


def read_level(text: str) -> Level:
    """Level from a text: "0.5", "-3 dB" (absolute), "0.5 of peak", "-3 dB of peak".

    Raises
    ------
    InputError
        If the text is none of these, or the level is not between 0 and 1.
    """
    match = re.fullmatch(r"\s*([-+]?[0-9.]+(?:[eE][-+]?\d+)?)\s*(dB)?\s*(of\s+peak)?\s*", text)
    try:
        value = float(match[1]) if match else float("nan")
    except ValueError:
        value = float("nan")
    if match and match[2]:
        value = 10.0 ** (value / 10.0)
    if not 0.0 < value < 1.0:
        raise InputError(
            f'level = "{text}"; it must lie between 0 and 1 (below 0 dB), written as "0.5", "-3 dB", '
            '"0.5 of peak" or "-3 dB of peak"'
        )
    return Level(value, of_peak=bool(match and match[3]))


def find_bands(
    stack: Stack,
    angles_deg: Sequence[float] | np.ndarray | None = None,
    level: Level | None = None,
    quantity: Quantity | None = None,
    model: Model | None = None,
    azimuths_deg: Sequence[float] | np.ndarray | None = None,
    cross: bool = False,
) -> list[BandList]:
    """Pass bands per polarization, azimuth and angle.

    Parameters
    ----------
    stack : Stack
        Its sweep gives the range of frequencies, the start grid and the polarizations.
    angles_deg : sequence of float, optional
        Angles of incidence [degrees]; default: those of the sweep.
    level : Level, optional
        Default: half of the peak of each spectrum.
    quantity : {"T", "R", "A"}, optional
        Default: transmittance; absorptance where the stack ends in a perfect conductor.
    model : {"nonlocal", "local"}, optional
        Default: that of the sweep.
    azimuths_deg : sequence of float, optional
        Azimuths of the plane of incidence [degrees]; default: those of the sweep, or one if they are all alike.
    cross : bool
        Also what leaves in the other polarization, if the stack mixes them; each with a peak of its own.

    Returns
    -------
    list of BandList
        Channel by channel, azimuth by azimuth, angle by angle.

    Raises
    ------
    InputError
        If the sweep has fewer than two frequencies, or T is asked for before a perfect conductor.
    """
    frequencies = stack.sweep.frequencies
    if frequencies.size < 2:
        raise InputError("the sweep has one frequency; a pass band needs a range: spectrum = { from, to, points }")
    quantity = quantity or default_quantity(stack)
    if quantity == "T" and stack.back is None:
        raise InputError("nothing is transmitted into a perfect conductor; ask for R or A")
    angles = stack.sweep.angles_deg if angles_deg is None else np.asarray(angles_deg, dtype=float)
    azimuths = stack.sweep.azimuths_deg if azimuths_deg is None else np.asarray(azimuths_deg, dtype=float)
    if not stack.depends_on_azimuth:
        azimuths = azimuths[:1]
    lines = []
    for is_cross in (False, True) if cross and quantity != "A" else (False,):
        for polarization in stack.sweep.polarizations:
            solver = Solver(stack, model, (polarization,))
            for channel in solver.channels[int(is_cross) : int(is_cross) + 1]:
                lines += [
                    (channel, Line(solver, float(angle), quantity, float(azimuth), is_cross))
                    for azimuth in azimuths
                    for angle in angles
                ]
    return [_bands_of(line, channel, frequencies, level or Level()) for channel, line in lines]


def default_quantity(stack: Stack) -> Quantity:
    """Transmittance, or absorptance where there is none."""
    return "A" if stack.back is None else "T"


def _bands_of(line: Line, channel: Channel, frequencies: np.ndarray, level: Level) -> BandList:
    f, power = _with_extrema(line, *fine_spectrum(line, frequencies))
    peak = float(power.max()) if power.size else float("nan")
    absolute = level.absolute(peak)
    skirt = SKIRT * absolute
    bands: list[Band] = []
    if peak > absolute and peak > line.noise:
        runs = _runs(power >= absolute)
        edges = _crossings(line, f, power, absolute)
        skirts = _crossings(line, f, power, skirt)
        measured = (_measure(f, power, first, last, edges, skirts) for first, last in runs)
        bands = [
            band for band in measured if band.width > EDGE_TOLERANCE * band.upper or band.cut_below or band.cut_above
        ]
    return BandList(
        channel, line.angle_deg, line.quantity, absolute, skirt, peak, tuple(bands), azimuth_deg=line.azimuth_deg
    )


def _with_extrema(line: Line, f: np.ndarray, power: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Add the extrema between the samples, found on the engine."""
    from scipy.optimize import elementwise

    if f.size < 3:
        return f, power
    rise = np.diff(power)
    for sign in (-1.0, 1.0):
        middle = np.flatnonzero((sign * rise[:-1] < 0.0) & (sign * rise[1:] >= 0.0)) + 1
        if middle.size == 0:
            continue
        bracket = (f[middle - 1], f[middle], f[middle + 1])
        tolerances = {"xatol": 0.0, "xrtol": 1e-12, "fatol": 0.0, "frtol": 1e-13}
        least = elementwise.find_minimum(
            lambda x, sign=sign: sign * line.power(x), bracket, tolerances=tolerances, maxiter=60
        )
        better = np.isfinite(least.f_x) & ~np.isin(least.x, f)
        order = np.searchsorted(f, least.x[better])
        f, power = np.insert(f, order, least.x[better]), np.insert(power, order, sign * least.f_x[better])
        rise = np.diff(power)
    return f, power


def _runs(above: np.ndarray) -> list[tuple[int, int]]:
    """First and last index of every run of True."""
    change = np.flatnonzero(np.diff(np.concatenate([[0], above.astype(int), [0]])))
    return [(int(a), int(b) - 1) for a, b in zip(change[::2], change[1::2], strict=True)]


def _crossings(line: Line, f: np.ndarray, power: np.ndarray, level: float) -> dict[int, float]:
    """Frequency of each crossing of the level, by the index of the sample below it in frequency."""
    from scipy.optimize import elementwise

    above = power >= level
    index = np.flatnonzero(above[:-1] != above[1:])
    if index.size == 0:
        return {}
    root = elementwise.find_root(
        lambda x: line.power(x) - level,
        (f[index], f[index + 1]),
        tolerances={"xatol": 0.0, "xrtol": EDGE_TOLERANCE, "fatol": 0.0, "frtol": 0.0},
        maxiter=200,
    )
    return dict(zip(index.tolist(), root.x.tolist(), strict=True))


def _measure(
    f: np.ndarray, power: np.ndarray, first: int, last: int, edges: dict[int, float], skirts: dict[int, float]
) -> Band:
    cut_below, cut_above = first == 0, last == f.size - 1
    lower = f[0] if cut_below else edges[first - 1]
    upper = f[-1] if cut_above else edges[last]
    inside = power[first : last + 1]
    best = first + int(np.argmax(inside))
    return Band(
        lower=float(lower),
        upper=float(upper),
        cut_below=cut_below,
        cut_above=cut_above,
        peak=float(power[best]),
        peak_frequency=float(f[best]),
        ripple_db=_ripple_db(inside),
        shape_factor=_shape_factor(lower, upper, first, last, edges, skirts),
    )


def _ripple_db(inside: np.ndarray) -> float:
    from scipy.signal import find_peaks

    maxima, _ = find_peaks(inside, prominence=_NOISE * inside.max())
    if maxima.size < 2:
        return 0.0
    between = inside[maxima[0] : maxima[-1] + 1]
    return float(10.0 * np.log10(between.max() / between.min()))


def _shape_factor(
    lower: float, upper: float, first: int, last: int, edges: dict[int, float], skirts: dict[int, float]
) -> float:
    """Skirt width over width; NaN if a skirt is not reached before the end or the next band."""
    below = max((i for i in skirts if i < first), default=None)
    above = min((i for i in skirts if i >= last), default=None)
    if below is None or above is None or not upper > lower:
        return float("nan")
    if any(below < i < first - 1 for i in edges) or any(last < i < above for i in edges):
        return float("nan")
    return (skirts[above] - skirts[below]) / (upper - lower)
