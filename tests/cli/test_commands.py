"""Every command in every mode, as it is meant to be used."""

import csv
import shutil
from pathlib import Path

import h5py
import numpy as np
import pytest
import xarray
from numpy.testing import assert_allclose, assert_array_equal

from slabsim import api
from tests.cli.conftest import STACK, SWEEP

SAMPLES = Path(__file__).parents[2] / "sample_stacks"
UNITS = {
    "um": 'spectrum = { from = "5000 um", to = "15000 um", points = 21 }\nangle = "60 deg"\n',
    "cm^-1": 'spectrum = { from = "0.7 cm^-1", to = "2 cm^-1", points = 21 }\nangle = "60 deg"\n',
    "meV": 'spectrum = { from = "0.08 meV", to = "0.24 meV", points = 21 }\nangle = "60 deg"\n',
}


def write_stack(name, sweep, before=""):
    Path(name).write_text(before + STACK + sweep)
    return name


def rows_of(text, first):
    """Cells of the table rows that start with a word."""
    return [line.split() for line in text.splitlines() if line.split()[:1] == [first]]


def test_sweep_counts_what_it_computed(slabsim, stack):
    ended = slabsim("sweep", stack)
    assert ended.code == 0
    assert ended.err == ""
    assert ended.out.startswith("slab.h5: 1 of 1 blocks are done\n164 points by 2 polarizations, nonlocal model, ")


def test_one_point_and_one_polarization_are_singular(slabsim, folder):
    write_stack("one.toml", 'spectrum = "30 GHz"\nangle = "30 deg"\npolarization = ["TM"]\n')
    assert "1 point by 1 polarization, nonlocal" in slabsim("sweep", "one.toml").out


def test_compressed_map_holds_the_same_numbers(slabsim, map_file):
    assert slabsim("sweep", "slab.toml", "-o", "small.h5", "--compress").code == 0
    with h5py.File("small.h5") as small, h5py.File(map_file) as plain:
        assert small["entry/data/transmittance"].compression == "gzip"
        assert_array_equal(small["transmittance"], plain["transmittance"])


def test_replaced_map_is_that_of_the_new_stack(slabsim, map_file):
    write_stack("slab.toml", SWEEP.replace("41", "7"))
    assert slabsim("sweep", "slab.toml", "--replace").code == 0
    with h5py.File(map_file) as file:
        assert file["frequency"].size == 7


def test_map_opens_in_xarray_and_h5py_by_path_alone(map_file):
    expected = api.solve(api.read_stack("slab.toml"), np.linspace(20e9, 60e9, 41), [0.0, 20.0, 40.0, 60.0])
    with xarray.open_dataset(map_file, engine="h5netcdf") as found:
        assert_array_equal(found["transmittance"].sel(polarization=1)[0], expected.T[1])
        assert found["frequency"].attrs["units"] == "Hz"
    with h5py.File(map_file) as file:
        assert_array_equal(file["transmittance"][0], expected.T)
        assert_array_equal(file["t_real"][0] + 1j * file["t_imag"][0], expected.t)


@pytest.mark.parametrize("unit", UNITS)
def test_bands_are_printed_in_the_unit_of_the_file_in_ascending_order(slabsim, folder, unit):
    write_stack("unit.toml", UNITS[unit])
    ended = slabsim("passbands", "unit.toml", "--model", "local", "--csv", "bands.csv")
    assert ended.code == 0
    heading = next(line for line in ended.out.splitlines() if "centre" in line)
    assert f"lower ({unit})" in heading
    lines = ended.out[ended.out.index("  TM ") :].splitlines()
    rows = [line.split() for line in lines[: lines.index("")]]
    lowers = [float(rows[0][3].strip("[]")), *(float(row[0].strip("[]")) for row in rows[1:])]
    assert len(lowers) > 1
    assert lowers == sorted(lowers)
    with open("bands.csv") as file:
        edges = [float(row["lower (Hz)"]) for row in csv.DictReader(file) if row["polarization"] == "TM"]
    assert len(edges) == len(lowers)


def test_csv_edges_solve_the_level_on_the_engine(slabsim, map_file):
    arguments = ["--level", "0.5", "--angle", "40", "--angle", "60", "--model", "local", "--csv", "bands.csv"]
    assert slabsim("passbands", map_file, *arguments).code == 0
    stack = api.read_stack("slab.toml")
    count = 0
    with open("bands.csv") as file:
        for row in csv.DictReader(file):
            for edge, cut in (("lower (Hz)", "cut below"), ("upper (Hz)", "cut above")):
                if row[cut] == "1":
                    continue
                around = float(row[edge]) * np.array([1 - 1e-9, 1 + 1e-9])
                found = api.solve(stack, around, float(row["angle (deg)"]), "local", (row["polarization"],))
                below, above = found.T.ravel() - float(row["level"])
                assert below * above < 0.0
                count += 1
    assert count >= 6


def test_bands_of_a_map_are_those_of_its_stack(slabsim, map_file):
    assert slabsim("passbands", map_file).out == slabsim("passbands", "slab.toml").out


def test_angles_are_sorted_and_given_once(slabsim, stack):
    assert slabsim("passbands", stack, "--angle", 60, "--angle", 5, "--angle", 60).out == (
        slabsim("passbands", stack, "--angle", 5, "--angle", 60).out
    )


@pytest.mark.parametrize("command", ["passbands", "compare"])
def test_at_most_ten_angles_are_shown_unless_asked(slabsim, folder, command):
    write_stack("many.toml", SWEEP.replace("points = 4 ", "points = 61 "))
    ended = slabsim(command, "many.toml")
    table = ended.out[: ended.out.index("Difference of T" if command == "compare" else "shape:")]
    assert [row[1] for row in rows_of(table, "TE")] == ["0", "7", "13", "20", "27", "33", "40", "47", "53", "60"]
    if command == "passbands":
        assert "10 of the 61 angles of the sweep; others with --angle" in ended.out


def test_absorptance_is_the_default_on_a_metal_back(slabsim, folder):
    write_stack("metal.toml", SWEEP, 'back = "perfect conductor"\n')
    assert "Bands where absorptance exceeds the level" in slabsim("passbands", "metal.toml").out
    assert "Bands where reflectance exceeds the level" in slabsim("passbands", "metal.toml", "--quantity", "r").out
    assert slabsim("sweep", "metal.toml").code == 0
    assert slabsim("plot", "metal.h5").out == "metal.png\n"


def test_group_and_film_are_described_in_place(slabsim, folder):
    group = '[[layer]]\nrepeat = 3\n[[layer.layers]]\nmaterial = "foam"\nthickness = "1 mm"\n'
    group += '[[layer.layers]]\nfilm = { sheet_resistance = "3770 ohm" }\n'
    Path("group.toml").write_text(STACK.replace("[[layer]]", group + "[[layer]]") + SWEEP)
    out = slabsim("describe", "group.toml").out
    assert rows_of(out, "1")[0] == ["1", "group", "repeated", "3", "times:"]
    assert rows_of(out, "1.2")[0] == ["1.2", "film", "3770", "ohm", "per", "square"]
    assert rows_of(out, "2")[0][:2] == ["2", "wire"]


def test_a_single_frequency_is_described_once(slabsim, folder):
    write_stack("one.toml", 'spectrum = "30 GHz"\nangle = "30 deg"\npolarization = ["TM"]\n')
    out = slabsim("describe", "one.toml").out
    assert "sweep 30 GHz, angle 30 deg, TM, nonlocal model" in out
    assert out.count("metal at 30 GHz") == 1


def test_a_map_is_described_as_its_stack(slabsim, map_file):
    assert slabsim("describe", map_file).out == slabsim("describe", "slab.toml").out


def test_comparison_goes_into_a_new_map_or_the_given_one(slabsim, map_file):
    in_place = slabsim("compare", map_file)
    assert in_place.out.endswith("differences in slab.h5 (/entry/comparison)\nfigure slab_compare.png\n")
    aside = slabsim("compare", "slab.toml")
    assert aside.out.endswith("differences in slab_compare.h5 (/entry/comparison)\nfigure slab_compare.png\n")
    with h5py.File(map_file) as one, h5py.File("slab_compare.h5") as other:
        for file in (one, other):
            data = file["entry/comparison"]
            difference = data["transmittance_local"][()] - data["transmittance_nonlocal"][()]
            assert_allclose(data["difference"], difference, atol=1e-15)
            assert_array_equal(data["transmittance_nonlocal"], file["transmittance"][0])
        assert abs(one["entry/comparison/difference"][1]).max() > 0.1


def test_comparison_and_plot_of_a_map_keep_separate_figures(slabsim, map_file):
    slabsim("plot", map_file)
    before = Path("slab.png").read_bytes()
    slabsim("compare", map_file)
    assert Path("slab.png").read_bytes() == before
    assert Path("slab_compare.png").read_bytes() != before


def test_comparison_of_one_frequency_shows_no_band_table(slabsim, folder):
    write_stack("one.toml", 'spectrum = "30 GHz"\nangle = { from = "0 deg", to = "60 deg", points = 3 }\n')
    ended = slabsim("compare", "one.toml")
    assert ended.code == 0
    assert "A single frequency: no bands.\n" in ended.out


def test_a_map_stands_alone_without_its_table_files(slabsim, folder):
    for name in ("gold_nanowires.toml", "glass.csv"):
        shutil.copy(SAMPLES / name, name)
    assert slabsim("sweep", "gold_nanowires.toml", "-o", "gold.h5").code == 0
    here = slabsim("passbands", "gold_nanowires.toml", "--angle", 30).out
    Path("glass.csv").unlink()
    Path("far").mkdir()
    moved = shutil.move("gold.h5", "far/gold.h5")
    assert slabsim("passbands", moved, "--angle", 30).out == here
    assert slabsim("plot", moved).out == "gold.png\n"
    assert "glass.csv" in slabsim("describe", "gold_nanowires.toml").err


def test_schema_goes_to_the_terminal_or_a_file(slabsim):
    printed = slabsim("schema").out
    assert slabsim("schema", "-o", "schema.json").out == "schema.json\n"
    assert Path("schema.json").read_text() == printed
