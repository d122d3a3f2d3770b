"""A stack as read and what becomes of the power in it, as tables of text; nothing is computed here."""

from __future__ import annotations

from math import isnan

from rich.console import Group, RenderableType
from rich.text import Text

from slabsim.analyses.description import Description, WireNumbers
from slabsim.analyses.losses import PowerBudget
from slabsim.report.columns import ColumnTable, fact_table, titled
from slabsim.units import format_frequency, format_length, format_spectral, spectral_kind

_LOSS_ROUNDING = 1e-12  # share of the incident power below which a loss is rounding


def description_tables(description: Description, unit: str) -> RenderableType:
    """The stack as read, and the derived numbers of its wires."""
    stack, ends = description.stack, tuple(dict.fromkeys(description.frequencies))
    back = "perfect conductor" if stack.back is None else stack.back.name
    sweep = stack.sweep
    lines = [
        Text(stack.title or stack.file_name, style="bold"),
        Text(f"front {stack.front.name}, back {back}"),
        Text(
            f"sweep {_range([format_spectral(f, unit) for f in ends], sweep.frequencies.size)}, "
            f"angle {_range([f'{angle:g} deg' for angle in sweep.angles_deg[[0, -1]]], sweep.angles_deg.size)}, "
            f"{_azimuths(description)}"
            f"{' and '.join(sweep.polarizations)}, {sweep.model} model"
        ),
    ]
    eps_columns = [(f"eps at {format_spectral(end, unit, 4)}", "right") for end in ends]
    table = ColumnTable([
        ("", "left"), ("kind", "left"), ("name", "left"), ("thickness", "right"), ("material", "left"),
        *eps_columns, ("", "left"),
    ], n_keys=2)  # fmt: skip
    for row in description.rows:
        thickness = "" if row.thickness is None else format_length(row.thickness)
        eps = [""] * len(ends) if row.eps is None else [_complex(v) for v in row.eps[: len(ends)]]
        table.add_row(row.place, row.kind, row.name, thickness, row.material, *eps, row.detail)
    return Group(
        *lines,
        Text(),
        titled("Stack, front to back", table),
        *(_wire_block(numbers, unit, ends) for numbers in description.wires),
        *(Text(note) for note in description.notes),
    )


def _azimuths(description: Description) -> str:
    azimuths = description.stack.sweep.azimuths_deg
    if not description.stack.depends_on_azimuth and azimuths.size == 1:
        return ""
    return f"azimuth {_range([f'{azimuth:g} deg' for azimuth in azimuths[[0, -1]]], azimuths.size)}, "


def loss_table(budget: PowerBudget) -> RenderableType:
    """Where the incident power goes, in percent of it."""
    table = ColumnTable([
        ("", "right"), ("element", "left"), ("part", "left"),
        *((f"{polarization} (%)", "right") for polarization in budget.polarizations),
    ], n_keys=3)  # fmt: skip
    for name, shares in budget.channels:
        table.add_row("", name, "", *(f"{100 * share:.6g}" for share in shares))
    table.add_section()
    for loss in budget.losses:
        place = "" if loss.part else str(loss.element + 1)
        name = f'"{loss.name}"' if loss.name else ""
        table.add_row(place, "" if loss.part else name, loss.part, *(_percent(share) for share in loss.shares))
    table.add_section()
    table.add_row("", "sum", "", *(f"{100 * total:.6g}" for total in budget.totals))
    note = (
        "wires: lost in the metal, a share of the row above it. The rest of a row is lost in the host, and in loads at "
        "the wire ends."
    )
    return Group(table, Text(note), Text()) if any(loss.part for loss in budget.losses) else Group(table, Text())


def _percent(share: float) -> str:
    return "0" if abs(share) < _LOSS_ROUNDING else f"{100 * share:.6g}"


def _wire_block(numbers: WireNumbers, unit: str, ends: tuple[float, ...]) -> RenderableType:
    plasma = ColumnTable(
        [("plasma formula", "left"), ("kp (rad/m)", "right"), ("plasma frequency in host", "right"), ("", "left")], 1
    )
    for value in numbers.plasma:
        edge = "-" if isnan(value.frequency) else format_frequency(value.frequency)
        if spectral_kind(unit) != "frequency" and not isnan(value.frequency):
            edge += f" = {format_spectral(value.frequency, unit)}"
        plasma.add_row(value.formula, f"{value.kp:.6g}", edge, "used" if value.is_used else "")
    facts = fact_table(_wire_facts(numbers, [format_spectral(end, unit, 4) for end in ends]))
    return Group(Text(f'{numbers.title} of "{numbers.layer}"', style="bold"), facts, plasma)


def _wire_facts(numbers: WireNumbers, ends: list[str]) -> list[tuple[str, str]]:
    """Name and value of each derived number, at the one or two `ends` of the sweep."""
    wires = numbers.wires
    sides = (wires.pitch,) if isinstance(wires.pitch, float) else wires.pitch
    pitch = " by ".join(format_length(side) for side in dict.fromkeys(sides))
    metal = "perfect conductor" if wires.metal is None else wires.metal.name
    facts = [
        ("wires", f"{numbers.direction}, pitch {pitch}, radius {format_length(wires.radius)}, {metal}"),
        ("fill fraction", f"{numbers.fill_fraction:.4g}"),
        (
            "pitch over wavelength in host",
            f"{numbers.pitch_over_wavelength:.3g} at {ends[-1]} (common practice: below 0.1)",
        ),
        ("thickness over wavelength in host", _at(ends, [f"{v:.4g}" for v in numbers.thickness_over_wavelength])),
    ]
    if numbers.stiffness is not None:
        facts.append(("stiffness l0", f"{numbers.stiffness:.4g} (charge on the joined wires over that on one set)"))
    if numbers.skin_depth and numbers.impedance:
        for end, skin, z in zip(ends, numbers.skin_depth, numbers.impedance, strict=False):
            depth = f"skin depth {format_length(skin, 4)} = {skin / wires.radius:.3g} radii"
            facts.append((f"metal at {end}", f"{depth}; wire impedance {_complex(z)} ohm/m"))
    facts.append(("local eps along the wires", _at(ends, [_complex(value) for value in numbers.local_eps])))
    if numbers.tem_loss_db:
        facts.append(("TEM loss over one pass, with host", _at(ends, [f"{v:.4g} dB" for v in numbers.tem_loss_db])))
    return facts


def _at(ends: list[str], values: list[str]) -> str:
    return ", ".join(f"{value} at {end}" for value, end in zip(values, ends, strict=False))


def _range(ends: list[str], count: int) -> str:
    return ends[0] if count == 1 else f"{ends[0]} to {ends[-1]} in {count} points"


def _complex(value: complex) -> str:
    if value.imag == 0.0:
        return f"{value.real:.5g}"
    return f"{value.real:.5g} {'+' if value.imag > 0 else '-'} {abs(value.imag):.4g}i"
