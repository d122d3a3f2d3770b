import csv
import io
from dataclasses import replace

import numpy as np
import pytest
from rich.console import Console

from slabsim.analyses.comparison import compare_models
from slabsim.analyses.description import describe_stack
from slabsim.constants import C0
from slabsim.report import stack_tables, tables
from slabsim.stack.sample import Film, Grid, Group, Layer, Mesh, Plates, WireSet
from tests.engine.twins import OPEN, medium, stack, wires
from tests.report.results import band, band_list, track

GHZ = 1e9


def text_of(renderable):
    """What goes into a pipe."""
    out = io.StringIO()
    tables.show(renderable, Console(file=out, force_terminal=False))
    return out.getvalue()


def row_of(text, *start):
    """Cells of the only row that starts so."""
    (row,) = [line.split() for line in text.splitlines() if line.split()[: len(start)] == list(start)]
    return row


def test_band_is_shown_in_the_unit_of_the_sweep():
    # 10 GHz to 12 GHz: centre 11, width 2, 2/11 = 18.18 %; peak 0.9 = 0.458 dB
    text = text_of(tables.band_table([band_list(band(10 * GHZ, 12 * GHZ))], "GHz"))
    expected = ["TM", "30", "0.45", "10", "12", "11", "2", "18.18", "0.9000", "0.458", "0.250", "1.500"]
    assert row_of(text, "TM") == expected
    assert "lower (GHz)" in text


def test_band_in_wavelengths_has_its_own_centre_and_width():
    # 10 um to 12 um: centre 11 um, not the wavelength of the centre frequency, 10.909 um
    text = text_of(tables.band_table([band_list(band(C0 / 12e-6, C0 / 10e-6))], "um"))
    assert row_of(text, "TM")[3:8] == ["10", "12", "11", "2", "18.18"]


def test_bands_ascend_in_the_unit_of_the_sweep():
    found = band_list(band(C0 / 12e-6, C0 / 10e-6), band(C0 / 4e-6, C0 / 3e-6))
    lines = text_of(tables.band_table([found], "um")).splitlines()
    assert lines.index(next(x for x in lines if " 4 " in x)) < lines.index(next(x for x in lines if " 12 " in x))


@pytest.mark.parametrize(("unit", "note"), [("GHz", "cut below by the sweep"), ("mm", "cut above by the sweep")])
def test_an_edge_that_the_sweep_cuts_is_in_brackets_on_the_side_of_its_unit(unit, note):
    text = text_of(tables.band_table([band_list(band(10 * GHZ, 12 * GHZ, cut_below=True))], unit))
    row = row_of(text, "TM")
    assert note in text
    assert [cell.startswith("[") for cell in row[3:5]] == ([True, False] if unit == "GHz" else [False, True])


def test_a_full_peak_has_no_negative_loss():
    text = text_of(tables.band_table([band_list(band(10 * GHZ, 12 * GHZ, peak=1.0), peak=1.0)], "GHz"))
    assert row_of(text, "TM")[8:10] == ["1.0000", "0.000"]
    assert "-0" not in text


def test_an_angle_without_a_band_says_what_the_spectrum_reaches():
    text = text_of(tables.band_table([band_list(peak=0.0123, quantity="A")], "GHz"))
    assert "no band: A is at most 0.0123" in text
    assert "below 1, dB" in text


def test_shape_that_is_not_reached_is_a_dash():
    text = text_of(tables.band_table([band_list(band(10 * GHZ, 12 * GHZ, shape=float("nan")))], "GHz"))
    assert row_of(text, "TM")[-1] == "-"


def test_shift_is_relative_to_the_first_angle():
    # 10 to 10.1 is +1 %, 12 to 11.4 is -5 %, width 2 to 1.3 is -35 %
    moving = track(band(10 * GHZ, 12 * GHZ), band(10.1 * GHZ, 11.4 * GHZ))
    text = text_of(tables.shift_table([("TM", moving)], "GHz"))
    assert row_of(text, "10", "10.1") == ["10", "10.1", "+1.000", "11.4", "-5.000", "-35.00"]


def test_bands_are_numbered_within_their_polarization():
    moving = track(band(10 * GHZ, 12 * GHZ), band(11 * GHZ, 12 * GHZ))
    text = text_of(tables.shift_table([("TE", moving), ("TM", moving), ("TM", moving)], "GHz"))
    assert [line.split()[:2] for line in text.splitlines() if line[2:4] in ("TE", "TM")] == [
        ["TE", "1"],
        ["TM", "1"],
        ["TM", "2"],
    ]


def test_bands_that_the_sweep_cuts_on_both_sides_have_no_shift_to_show():
    whole = band(10 * GHZ, 40 * GHZ, cut_below=True, cut_above=True)
    assert text_of(tables.shift_table([("TE", track(whole, whole))], "GHz")) == ""


def test_comparison_names_no_place_of_a_rounding_error_and_no_share_of_zero():
    frequencies = np.linspace(10e9, 40e9, 31)
    slab = Layer("slab", medium(1.1), 8e-3, wires(2e-3, 5e-5))
    sample = stack(slab, frequencies=frequencies, angles_deg=np.array([0.0, 30.0, 60.0]))
    found = compare_models(sample)
    found = replace(found, regions=(replace(found.regions[0], share=1e-6, angles_deg=(30.0, 30.0)),))
    text = text_of(tables.comparison_tables(found, "GHz"))
    assert row_of(text[text.index("Difference") :], "TE", "0")[2:4] == ["0", "-"]
    assert row_of(text[text.index("Where") :], "TM")[3] == "30"
    assert "< 0.01 %" in text
    assert f"TM: {found.verdicts['TM']}" in text


def test_description_shows_groups_sheets_and_both_ends_of_the_sweep():
    slab = Layer("slab", medium(2.0), 3e-3, wires(2e-3, 5e-5))
    group = Group(5, (Layer("skin", medium(4.0), 1e-3), Film("sheet", sheet_resistance=377.0)))
    sample = stack(group, slab, frequencies=np.array([10e9, 20e9]))
    text = text_of(stack_tables.description_tables(describe_stack(sample), "GHz"))
    assert row_of(text, "1", "group") == ["1", "group", "repeated", "5", "times:"]
    assert row_of(text, "1.1")[1:6] == ["layer", "skin", "1", "mm", medium(4.0).name]
    assert row_of(text, "1.2")[1:] == ["film", "sheet", "377", "ohm", "per", "square"]
    assert "eps at 10 GHz" in text
    assert "eps at 20 GHz" in text
    assert row_of(text, "lattice")[-1] == "used"


def test_description_shows_every_set_the_mesh_and_what_diffracts():
    flat = WireSet((2e-3, 3e-3), 5e-5, None, (OPEN, OPEN), direction=(1.0, 0.0, 0.0))
    mesh = Layer("cubes", medium(1.0), 8e-3, mesh=Mesh(2e-3, 5e-5, None, (OPEN, OPEN), stiffness=1.7))
    grid = Grid("", 10e-3, 1e-4, None, (0.0, 1.0, 0.0))
    vent = Plates("vent", 6e-3, 4e-3, "y", medium(1.0))
    sample = stack(Layer("crossed", medium(1.0), 4e-3, (*wires(2e-3, 5e-5), flat)), mesh, grid, vent)
    text = text_of(stack_tables.description_tables(describe_stack(sample), "GHz"))
    assert 'Wires 1 of "crossed"' in text
    assert 'Wires 2 of "crossed"' in text
    assert "along x, pitch 2 mm by 3 mm, radius 50 um, perfect conductor" in text
    assert 'Mesh of "cubes"' in text
    assert "1.7 (charge on the joined wires over that on one set)" in text
    assert "azimuth 0 deg, TE and TM" in text
    assert "cut-off 37.4741 GHz" in text  # c/(2 b), b = 4 mm
    assert "Diffraction, or a second mode between plates, sets in at 29.9792 GHz (0 deg)" in text


def test_pipe_gets_no_trailing_blanks():
    text = text_of(tables.band_table([band_list(band(10 * GHZ, 12 * GHZ))], "GHz"))
    assert all(line == line.rstrip() for line in text.splitlines())


def test_csv_is_in_si_units_whatever_the_sweep_was_written_in():
    lists = [band_list(band(10 * GHZ, 12 * GHZ, cut_above=True, peak=1.0)), band_list(polarization="TE")]
    (row,) = csv.DictReader(io.StringIO(tables.bands_as_csv(lists)))
    assert float(row["lower (Hz)"]) == 10e9
    assert float(row["centre (Hz)"]) == 11e9
    assert (row["cut below"], row["cut above"]) == ("0", "1")
    assert row["insertion loss (dB)"] == "0"
