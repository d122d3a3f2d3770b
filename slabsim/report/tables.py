"""Results as tables of text; nothing is computed here."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from itertools import groupby
from math import isnan, log10
from typing import TypeVar

from rich.console import Console, Group, RenderableType
from rich.text import Text

from slabsim.analyses.comparison import AngleSummary, Comparison, EdgePair
from slabsim.analyses.passbands import SKIRT, Band, BandList
from slabsim.analyses.tracking import Track
from slabsim.report.columns import ColumnTable, titled
from slabsim.units import format_spectral, from_hz, spectral_kind

_WORDS = {"T": "transmittance", "R": "reflectance", "A": "absorptance"}
_DIGITS = 7
_PIPE_WIDTH = 240
_ROUNDING = 1e-9  # differences below it have no place worth naming
Item = TypeVar("Item")


def band_table(lists: Sequence[BandList], unit: str) -> RenderableType:
    """Pass bands per polarization and angle, with the levels they were found at.

    Parameters
    ----------
    lists : sequence of BandList
    unit : str
        Spectral unit of all edges.
    """
    quantity = lists[0].quantity if lists else "T"
    has_azimuths = len({found.azimuth_deg for found in lists}) > 1
    loss = "loss dB" if quantity == "T" else "below 1, dB"
    table = ColumnTable([
        ("pol", "left"), *([("azimuth (deg)", "right")] if has_azimuths else []),
        ("angle (deg)", "right"), (f"level {quantity}", "right"), (f"lower ({unit})", "right"),
        (f"upper ({unit})", "right"), (f"centre ({unit})", "right"), (f"width ({unit})", "right"), ("width %", "right"),
        ("peak", "right"), (loss, "right"), ("ripple dB", "right"), ("shape", "right"), ("note", "left"),
    ], n_keys=3 if has_azimuths else 2)  # fmt: skip
    for before, found in zip([None, *lists], lists, strict=False):
        if before is not None and before.polarization != found.polarization:
            table.add_section()
        azimuth = [f"{found.azimuth_deg:g}"] if has_azimuths else []
        head: tuple[str, ...] = (_words(found.polarization), *azimuth, f"{found.angle_deg:g}", f"{found.level:.4g}")
        if not found.bands:
            table.add_row(*head, *["-"] * 9, f"no band: {quantity} is at most {found.peak:.3g}")
        for band in _ascending(found.bands, unit):
            table.add_row(*head, *_band_cells(band, unit))
            head = ("",) * len(head)
    notes = [
        f"shape: width at {SKIRT:g} of the level ({-10 * log10(SKIRT):.0f} dB below it) over width at the level; "
        "- where that is not reached.",
        "centre: mid-point of the edges. ripple: between the outermost maxima of a band.",
        "[ ]: end of the sweep, not of the band. Edges are solved on the engine, not read off the grid.",
    ]
    title = f"Bands where {_WORDS[quantity]} exceeds the level"
    return titled(title, Group(table, *(Text(note) for note in notes), Text()))


def shift_table(tracks: Sequence[tuple[str, Track]], unit: str) -> RenderableType:
    """Edges of each band that is seen at several angles, and their shift from its smallest angle.

    Bands without an edge inside the sweep are left out; nothing is printed where no band is left.

    Parameters
    ----------
    tracks : sequence of (words, Track)
        The words say which channel, and at which azimuth.
    unit : str
    """
    table = ColumnTable([
        ("pol", "left"), ("band", "right"), ("angle (deg)", "right"), (f"lower ({unit})", "right"),
        ("shift %", "right"), (f"upper ({unit})", "right"), ("shift %", "right"), ("width change %", "right"),
    ], n_keys=3)  # fmt: skip
    shown = [(polarization, track) for polarization, track in tracks if _has_edge(track)]
    counts: dict[str, int] = {}
    for polarization, track in shown:
        counts[polarization] = counts.get(polarization, 0) + 1
        head = (polarization, str(counts[polarization]))
        first = track.bands[0]
        for angle, band in zip(track.angles_deg, track.bands, strict=True):
            edges = zip(_edges(band, unit), _edges(first, unit), strict=True)
            cells = [cell for here, start in edges for cell in (here.text, here.shift_from(start))]
            table.add_row(*head, f"{angle:g}", *cells, _width_change(band, first, unit))
            head = ("", "")
        table.add_section()
    if not shown:
        return Group()
    note = "shift: from the first angle of the band; - where the sweep ends before the edge, here or there."
    return titled("Shift of the band edges with angle", Group(table, Text(note), Text()))


def comparison_tables(comparison: Comparison, unit: str, most: int = 6) -> RenderableType:
    """Band edges of both models, their differences, the regions where they part, and the verdicts."""
    trusted, other = comparison.models
    difference = f"Difference of {comparison.quantity}, {other} minus {trusted}, over the sweep"
    part = f"they part by more than {comparison.tolerance:g}"
    verdicts = [Text(f"{_words(channel)}: {sentence}") for channel, sentence in comparison.verdicts.items()]
    return Group(
        titled(f"Bands in the {trusted} and the {other} model ({unit})", _pair_table(comparison, unit))
        if comparison.bands
        else Text(
            "A single frequency: no bands.\n" if comparison.frequencies.size < 2 else "No band in either model.\n"
        ),
        titled(difference, _difference_table(comparison, unit, most)),
        titled(f"Where {part}", _region_table(comparison, unit, most))
        if comparison.regions
        else Text(f"Nowhere do {part}.\n"),
        *verdicts,
    )


def _pair_table(comparison: Comparison, unit: str) -> ColumnTable:
    trusted, other = comparison.models
    table = ColumnTable([
        ("pol", "left"), ("angle (deg)", "right"), (f"lower {trusted}", "right"), (f"lower {other}", "right"),
        ("diff %", "right"), (f"upper {trusted}", "right"), (f"upper {other}", "right"), ("diff %", "right"),
    ], n_keys=2)  # fmt: skip
    for _, pairs in groupby(comparison.bands, key=lambda pair: (pair.polarization, pair.angle_deg)):
        for pair in _ascending(list(pairs), unit):
            table.add_row(*_pair_cells(pair, unit))
    return table


def _difference_table(comparison: Comparison, unit: str, most: int) -> ColumnTable:
    table = ColumnTable([
        ("pol", "left"), ("angle (deg)", "right"), ("largest", "right"), (f"at ({unit})", "right"), ("mean", "right"),
    ], n_keys=2)  # fmt: skip
    for row in _chosen(comparison, most):
        table.add_row(
            _words(row.polarization),
            f"{row.angle_deg:g}",
            f"{row.largest:.3g}",
            _value(row.largest_at, unit) if row.largest > _ROUNDING else "-",
            f"{row.mean:.3g}",
        )
    return table


def _region_table(comparison: Comparison, unit: str, most: int) -> ColumnTable:
    table = ColumnTable([
        ("pol", "left"), (f"from ({unit})", "right"), ("to", "right"), ("angles (deg)", "right"), ("largest", "right"),
        ("at", "left"), ("share of grid", "right"),
    ], n_keys=1)  # fmt: skip
    for region in comparison.regions[:most]:
        low, high = sorted(from_hz(f, unit) for f in region.frequencies)
        share = f"{100 * region.share:.2f} %" if region.share >= 5e-5 else "< 0.01 %"
        table.add_row(
            _words(region.polarization),
            f"{low:.{_DIGITS}g}",
            f"{high:.{_DIGITS}g}",
            " to ".join(f"{angle:g}" for angle in dict.fromkeys(region.angles_deg)),
            f"{region.largest:.3g}",
            f"{format_spectral(region.largest_at[0], unit, 6)}, {region.largest_at[1]:g} deg",
            share,
        )
    rest = len(comparison.regions) - most
    if rest > 0:
        table.add_row("", "", "", "", "", f"and {rest} smaller region{'s' if rest > 1 else ''}", "")
    return table


def show(renderable: RenderableType, console: Console | None = None) -> None:
    """Print; into a pipe or a file as wide as the content and without trailing blanks."""
    console = console or Console()
    if console.is_terminal:
        console.print(renderable)
        return
    wide = Console(width=_PIPE_WIDTH, file=io.StringIO(), color_system=None)
    with wide.capture() as capture:
        wide.print(renderable)
    for line in capture.get().splitlines():
        print(line.rstrip(), file=console.file)
    console.file.flush()  # a full disk shows here, not at exit


def bands_as_csv(lists: Iterable[BandList]) -> str:
    """Pass bands as comma-separated text: SI units, one band a line, header with units."""
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow([
        "polarization", "azimuth (deg)", "angle (deg)", "quantity", "level", "lower (Hz)", "upper (Hz)", "centre (Hz)",
        "width (Hz)", "fractional width", "peak", "peak at (Hz)", "insertion loss (dB)", "ripple (dB)", "shape factor",
        "cut below", "cut above",
    ])  # fmt: skip
    for found in lists:
        for band in found.bands:
            numbers = (
                found.level, band.lower, band.upper, band.centre, band.width, band.fractional_width, band.peak,
                band.peak_frequency, band.insertion_loss_db, band.ripple_db, band.shape_factor,
            )  # fmt: skip
            text = [f"{number + 0.0:.15g}" for number in numbers]  # no -0
            flags = [int(band.cut_below), int(band.cut_above)]
            angles = [f"{found.azimuth_deg:g}", f"{found.angle_deg:g}"]
            writer.writerow([found.polarization, *angles, found.quantity, *text, *flags])
    return out.getvalue()


def _words(channel: str) -> str:
    return channel.replace("_", " ")


def _ascending(items: Sequence[Item], unit: str) -> Sequence[Item]:
    """Items in ascending order of frequency, put in ascending order of their value in `unit`."""
    return items[::-1] if spectral_kind(unit) == "wavelength" else items


def _has_edge(track: Track) -> bool:
    return any(not (band.cut_below and band.cut_above) for band in track.bands)


@dataclass(frozen=True)
class _Edge:
    """A band edge in the unit of the report; in brackets where the sweep ends and not the band."""

    value: float
    is_cut: bool

    @property
    def text(self) -> str:
        number = f"{self.value:.{_DIGITS}g}"
        return f"[{number}]" if self.is_cut else number

    def shift_from(self, start: _Edge) -> str:
        if self.is_cut or start.is_cut:
            return "-"
        return f"{100 * (self.value - start.value) / start.value:+.3f}"


def _edges(band: Band, unit: str) -> tuple[_Edge, _Edge]:
    """Edges in ascending order of their value in `unit`."""
    lower = _Edge(from_hz(band.lower, unit), band.cut_below)
    upper = _Edge(from_hz(band.upper, unit), band.cut_above)
    return (lower, upper) if lower.value <= upper.value else (upper, lower)


def _width_change(band: Band, first: Band, unit: str) -> str:
    if _is_cut(band) or _is_cut(first):
        return "-"
    widths = [abs(from_hz(one.upper, unit) - from_hz(one.lower, unit)) for one in (band, first)]
    return f"{100 * (widths[0] / widths[1] - 1.0):+.2f}"


def _band_cells(band: Band, unit: str) -> list[str]:
    lower, upper = _edges(band, unit)
    centre, width = 0.5 * (lower.value + upper.value), upper.value - lower.value
    note = {(True, True): "cut at both ends", (True, False): "cut below", (False, True): "cut above"}
    return [
        lower.text,
        upper.text,
        f"{centre:.{_DIGITS}g}",
        f"{width:.5g}",
        f"{100 * width / centre:.4g}",
        f"{band.peak:.4f}" if band.peak > 1e-3 else f"{band.peak:.3g}",
        f"{max(0.0, band.insertion_loss_db):.3f}",
        f"{band.ripple_db:.3f}",
        "-" if isnan(band.shape_factor) else f"{band.shape_factor:.3f}",
        f"{note[lower.is_cut, upper.is_cut]} by the sweep" if _is_cut(band) else "",
    ]


def _pair_cells(pair: EdgePair, unit: str) -> list[str]:
    edges = [None if band is None else _edges(band, unit) for band in (pair.trusted, pair.other)]
    cells = [_words(pair.polarization), f"{pair.angle_deg:g}"]
    for side in (0, 1):
        trusted, other = (None if both is None else both[side] for both in edges)
        cells += ["no band" if edge is None else edge.text for edge in (trusted, other)]
        cells.append("-" if trusted is None or other is None else other.shift_from(trusted))
    return cells


def _chosen(comparison: Comparison, most: int) -> Iterator[AngleSummary]:
    """Rows of at most `most` angles per channel, first and last among them."""
    for channel in comparison.verdicts:  # cross terms that are zero have none
        rows = [row for row in comparison.angles if row.polarization == channel]
        count = min(most, len(rows))
        places = {round(i * (len(rows) - 1) / max(count - 1, 1)) for i in range(count)}
        yield from (row for place, row in enumerate(rows) if place in places)


def _is_cut(band: Band) -> bool:
    return band.cut_below or band.cut_above


def _value(frequency: float, unit: str) -> str:
    return f"{from_hz(frequency, unit):.{_DIGITS}g}"
