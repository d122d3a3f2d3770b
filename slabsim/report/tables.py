"""Results as tables of text; nothing is computed here."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from math import isnan, log10

from rich.box import SIMPLE_HEAD
from rich.console import Console, Group, RenderableType
from rich.table import Table
from rich.text import Text

from slabsim.analyses.comparison import AngleSummary, Comparison, EdgePair
from slabsim.analyses.description import Description, WireNumbers
from slabsim.analyses.passbands import SKIRT, Band, BandList
from slabsim.analyses.tracking import Track
from slabsim.units import format_frequency, format_length, format_spectral, from_hz, spectral_kind

SAFETY = (
    "Results describe an ideal model. For protection (laser eyewear, RF exposure) rely on the applicable standards, "
    "certified measurements and licensed practice."
)
_WORDS = {"T": "transmittance", "R": "reflectance", "A": "absorptance"}
_DIGITS = 7


def band_table(lists: Sequence[BandList], unit: str) -> RenderableType:
    """Pass bands per polarization and angle, with the levels they were found at.

    Parameters
    ----------
    lists : sequence of BandList
    unit : str
        Spectral unit of all edges.
    """
    quantity = lists[0].quantity if lists else "T"
    loss = "loss dB" if quantity == "T" else "below 1, dB"
    table = _table([
        ("pol", "left"), ("angle", "right"), (f"level {quantity}", "right"), (f"lower ({unit})", "right"),
        (f"upper ({unit})", "right"), (f"centre ({unit})", "right"), (f"width ({unit})", "right"), ("width %", "right"),
        ("peak", "right"), (loss, "right"), ("ripple dB", "right"), ("shape", "right"), ("note", "left"),
    ])  # fmt: skip
    for before, found in zip([None, *lists], lists, strict=False):
        if before is not None and before.polarization != found.polarization:
            table.add_section()
        head: tuple[str, ...] = (found.polarization, f"{found.angle_deg:g}", f"{found.level:.4g}")
        if not found.bands:
            table.add_row(*head, *["-"] * 9, f"no band: {quantity} is at most {found.peak:.3g}")
        for band in found.bands:
            table.add_row(*head, *_band_cells(band, unit))
            head = ("", "", "")
    notes = [
        f"shape: width at {SKIRT:g} of the level ({-10 * log10(SKIRT):.0f} dB below it) over width at the level; "
        "- where that is not reached.",
        "centre: mid-point of the edges. ripple: between the outermost maxima of a band.",
        "[ ]: end of the sweep, not of the band. Edges are solved on the engine, not read off the grid.",
    ]
    title = f"Bands where {_WORDS[quantity]} exceeds the level"
    return _titled(title, Group(table, *(Text(note) for note in notes), Text()))


def shift_table(tracks: Sequence[tuple[str, Track]], unit: str) -> RenderableType:
    """Edges of each band that is seen at several angles, and their shift from its smallest angle.

    Parameters
    ----------
    tracks : sequence of (polarization, Track)
    unit : str
    """
    table = _table([
        ("pol", "left"), ("band", "right"), ("angle", "right"), (f"lower ({unit})", "right"), ("shift %", "right"),
        (f"upper ({unit})", "right"), ("shift %", "right"), ("width change %", "right"),
    ])  # fmt: skip
    for number, (polarization, track) in enumerate(tracks, start=1):
        head = (polarization, str(number))
        first = track.bands[0]
        for angle, band in zip(track.angles_deg, track.bands, strict=True):
            edges = zip(_edges(band, unit), _edges(first, unit), strict=True)
            cells = [cell for here, start in edges for cell in (here.text, here.shift_from(start))]
            table.add_row(*head, f"{angle:g}", *cells, _width_change(band, first, unit))
            head = ("", "")
        table.add_section()
    return _titled("Shift of the band edges with angle", table)


def comparison_tables(comparison: Comparison, unit: str, most: int = 6) -> RenderableType:
    """Band edges of both models, their differences, the regions where they part, and the verdicts."""
    trusted, other = comparison.models
    edges = _table([
        ("pol", "left"), ("angle", "right"), (f"lower {trusted}", "right"), (f"lower {other}", "right"),
        ("diff %", "right"), (f"upper {trusted}", "right"), (f"upper {other}", "right"), ("diff %", "right"),
    ])  # fmt: skip
    for pair in comparison.bands:
        edges.add_row(*_pair_cells(pair, unit))
    parts = _table([
        ("pol", "left"), ("angle", "right"), ("largest", "right"), (f"at ({unit})", "right"), ("mean", "right"),
    ])  # fmt: skip
    for row in _chosen(comparison, most):
        parts.add_row(
            row.polarization,
            f"{row.angle_deg:g}",
            f"{row.largest:.3g}",
            _value(row.largest_at, unit),
            f"{row.mean:.3g}",
        )
    where = _table([
        ("pol", "left"), (f"from ({unit})", "right"), ("to", "right"), ("angles", "right"), ("largest", "right"),
        ("at", "left"), ("share of grid", "right"),
    ])  # fmt: skip
    for region in comparison.regions[:most]:
        low, high = sorted(from_hz(f, unit) for f in region.frequencies)
        where.add_row(
            region.polarization,
            f"{low:.{_DIGITS}g}",
            f"{high:.{_DIGITS}g}",
            f"{region.angles_deg[0]:g} to {region.angles_deg[1]:g}",
            f"{region.largest:.3g}",
            f"{format_spectral(region.largest_at[0], unit, 6)}, {region.largest_at[1]:g} deg",
            f"{100 * region.share:.2f} %",
        )
    rest = len(comparison.regions) - most
    if rest > 0:
        where.add_row("", "", "", "", "", f"and {rest} smaller regions", "")
    difference = f"Difference of {comparison.quantity}, {other} minus {trusted}, over the sweep"
    shown = [_titled(f"Bands in the {trusted} and the {other} model ({unit})", edges), _titled(difference, parts)]
    part = f"they part by more than {comparison.tolerance:g}"
    shown.append(_titled(f"Where {part}", where) if comparison.regions else Text(f"Nowhere do {part}.\n"))
    verdicts = [Text(f"{polarization}: {sentence}") for polarization, sentence in comparison.verdicts.items()]
    return Group(*shown, *verdicts)


def description_tables(description: Description, unit: str) -> RenderableType:
    """The stack as read, and the derived numbers of its wires."""
    stack, (low, high) = description.stack, description.frequencies
    back = "perfect conductor" if stack.back is None else stack.back.name
    span = f"{format_spectral(low, unit)} to {format_spectral(high, unit)}"
    sweep = stack.sweep
    lines = [
        Text(stack.title or stack.file_name, style="bold"),
        Text(f"front {stack.front.name}, back {back}"),
        Text(
            f"sweep {span} in {sweep.frequencies.size} points, {sweep.angles_deg[0]:g} to {sweep.angles_deg[-1]:g} deg "
            f"in {sweep.angles_deg.size}, {' and '.join(sweep.polarizations)}, {sweep.model} model"
        ),
    ]
    eps_columns = [(f"eps at {format_spectral(end, unit, 4)}", "right") for end in (low, high)]
    table = _table([
        ("", "left"), ("kind", "left"), ("name", "left"), ("thickness", "right"), ("material", "left"),
        *eps_columns, ("", "left"),
    ])  # fmt: skip
    for row in description.rows:
        thickness = "" if row.thickness is None else format_length(row.thickness)
        eps = ("", "") if row.eps is None else tuple(_complex(value) for value in row.eps)
        table.add_row(row.place, row.kind, row.name, thickness, row.material, *eps, row.detail)
    return Group(
        *lines,
        Text(),
        _titled("Stack, front to back", table),
        *(_wire_block(numbers, unit, (low, high)) for numbers in description.wires),
    )


def show(renderable: RenderableType, console: Console | None = None) -> None:
    """Print; without a terminal as wide as the content, so that no column is cut."""
    console = console or Console()
    if not console.is_terminal:
        console = Console(width=240, file=console.file)
    console.print(renderable, soft_wrap=False)


def bands_as_csv(lists: Iterable[BandList]) -> str:
    """Pass bands as comma-separated text: SI units, one band a line, header with units."""
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow([
        "polarization", "angle (deg)", "quantity", "level", "lower (Hz)", "upper (Hz)", "centre (Hz)", "width (Hz)",
        "fractional width", "peak", "peak at (Hz)", "insertion loss (dB)", "ripple (dB)", "shape factor",
        "cut below", "cut above",
    ])  # fmt: skip
    for found in lists:
        for band in found.bands:
            numbers = (
                found.level, band.lower, band.upper, band.centre, band.width, band.fractional_width, band.peak,
                band.peak_frequency, band.insertion_loss_db, band.ripple_db, band.shape_factor,
            )  # fmt: skip
            text = [f"{number:.15g}" for number in numbers]
            flags = [int(band.cut_below), int(band.cut_above)]
            writer.writerow([found.polarization, f"{found.angle_deg:g}", found.quantity, *text, *flags])
    return out.getvalue()


def _wire_block(numbers: WireNumbers, unit: str, ends: tuple[float, float]) -> RenderableType:
    wires = numbers.wires
    low, high = (format_spectral(end, unit, 4) for end in ends)
    pitch = " by ".join(format_length(side) for side in dict.fromkeys(wires.pitch))
    metal = "perfect conductor" if wires.metal is None else wires.metal.name
    facts = _table([("", "left"), ("", "left")], header=False)
    facts.add_row("wires", f"pitch {pitch}, radius {format_length(wires.radius)}, {metal}")
    facts.add_row("fill fraction", f"{numbers.fill_fraction:.4g}")
    facts.add_row(
        "pitch over wavelength in the host",
        f"{numbers.pitch_over_wavelength:.3g} at {high} (common practice: below 0.1)",
    )
    first, last = numbers.thickness_over_wavelength
    facts.add_row("thickness over wavelength in the host", f"{first:.4g} at {low}, {last:.4g} at {high}")
    if numbers.skin_depth and numbers.impedance:
        for word, skin, z in zip((low, high), numbers.skin_depth, numbers.impedance, strict=True):
            facts.add_row(
                f"metal at {word}",
                f"skin depth {format_length(skin, 4)} = {skin / wires.radius:.3g} radii; "
                f"wire impedance {_complex(z)} ohm/m",
            )
    eps = [_complex(value) for value in numbers.local_eps]
    facts.add_row("local eps along the wires", f"{eps[0]} at {low}, {eps[1]} at {high}")
    first, last = numbers.tem_loss_db
    facts.add_row("TEM loss over one pass, host included", f"{first:.4g} dB at {low}, {last:.4g} dB at {high}")
    plasma = _table(
        [("plasma formula", "left"), ("kp (rad/m)", "right"), ("plasma frequency in host", "right"), ("", "left")]
    )
    for value in numbers.plasma:
        edge = "-" if isnan(value.frequency) else format_frequency(value.frequency)
        if spectral_kind(unit) != "frequency" and not isnan(value.frequency):
            edge += f" = {format_spectral(value.frequency, unit)}"
        plasma.add_row(value.formula, f"{value.kp:.6g}", edge, "used" if value.is_used else "")
    return Group(Text(f'Wires of "{numbers.layer}"', style="bold"), facts, plasma)


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
        f"{max(band.insertion_loss_db, 0.0):.3f}",
        f"{band.ripple_db:.3f}",
        "-" if isnan(band.shape_factor) else f"{band.shape_factor:.3f}",
        f"{note[lower.is_cut, upper.is_cut]} by the sweep" if _is_cut(band) else "",
    ]


def _pair_cells(pair: EdgePair, unit: str) -> list[str]:
    edges = [None if band is None else _edges(band, unit) for band in (pair.trusted, pair.other)]
    cells = [pair.polarization, f"{pair.angle_deg:g}"]
    for side in (0, 1):
        trusted, other = (None if both is None else both[side] for both in edges)
        cells += ["no band" if edge is None else edge.text for edge in (trusted, other)]
        cells.append("-" if trusted is None or other is None else other.shift_from(trusted))
    return cells


def _chosen(comparison: Comparison, most: int) -> Iterator[AngleSummary]:
    """Rows of at most `most` angles per polarization, first and last among them."""
    for polarization in comparison.polarizations:
        rows = [row for row in comparison.angles if row.polarization == polarization]
        count = min(most, len(rows))
        places = {round(i * (len(rows) - 1) / max(count - 1, 1)) for i in range(count)}
        yield from (row for place, row in enumerate(rows) if place in places)


def _is_cut(band: Band) -> bool:
    return band.cut_below or band.cut_above


def _value(frequency: float, unit: str) -> str:
    return f"{from_hz(frequency, unit):.{_DIGITS}g}"


def _complex(value: complex) -> str:
    if value.imag == 0.0:
        return f"{value.real:.5g}"
    return f"{value.real:.5g} {'+' if value.imag > 0 else '-'} {abs(value.imag):.4g}i"


def _titled(title: str, body: RenderableType) -> RenderableType:
    return Group(Text(title, style="bold"), body)


def _table(columns: list[tuple[str, str]], header: bool = True) -> Table:
    table = Table(box=SIMPLE_HEAD, show_header=header)
    for name, justify in columns:
        table.add_column(Text(name), justify=justify, no_wrap=True)  # type: ignore[arg-type]
    return table
