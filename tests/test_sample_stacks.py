"""The sample stacks run through every command, and show what their comments promise."""

import json
import struct
import tomllib
from pathlib import Path

import jsonschema
import numpy as np
import pytest

from slabsim import api
from tests.cli.conftest import folder, slabsim  # noqa: F401 - fixtures

SAMPLES = Path(__file__).parents[1] / "sample_stacks"
NAMES = [
    *("gold_nanowires", "honeycomb_vent", "ka_band_window", "mesh_window", "negative_index", "patches_on_wires"),
    *("stacked_grids", "tilted_wires", "wire_absorber"),
]
FINITE = [name for name in NAMES if name not in ("honeycomb_vent", "stacked_grids")]  # the others diffract


def sample(name):
    return api.read_stack(SAMPLES / f"{name}.toml")


def test_these_are_all_samples():
    assert sorted(path.stem for path in SAMPLES.glob("*.toml")) == NAMES


@pytest.mark.parametrize("name", NAMES)
def test_sample_runs_through_every_command(slabsim, name):  # noqa: F811
    source, map_file = SAMPLES / f"{name}.toml", Path(f"{name}.h5")
    title = tomllib.loads(source.read_text())["title"]
    assert slabsim("describe", source).out.startswith(title)
    assert slabsim("sweep", source).code == 0
    bands = slabsim("passbands", map_file, "--angle", 30, "--csv", "bands.csv")
    assert bands.code == 0
    assert len(Path("bands.csv").read_text().splitlines()) > 1
    assert slabsim("plot", map_file).out == f"{name}.png\n"
    compared = slabsim("compare", map_file, "--angle", 30)
    assert compared.code == 0
    assert any(f"TM: {words}" in compared.out for words in ("Local model ", "No wires: the two models are the same"))
    for figure in (f"{name}.png", f"{name}_compare.png"):
        assert struct.unpack(">II", Path(figure).read_bytes()[16:24]) == (1680, 1080)
    with api.open_map(map_file) as found:
        assert found.is_complete
        for quantity in ("reflectance", "absorptance"):
            for azimuth in range(found.azimuths_deg.size):
                powers = found.read(quantity, "TM", azimuth)
                assert np.all(np.isfinite(powers)) or name not in FINITE
                assert np.nanmin(powers) > -1e-12
                assert np.nanmax(powers) < 1.0 + 1e-12


@pytest.mark.parametrize("name", NAMES)
def test_sample_satisfies_the_schema(slabsim, name):  # noqa: F811
    schema = json.loads(slabsim("schema").out)
    jsonschema.Draft202012Validator.check_schema(schema)
    document = tomllib.loads((SAMPLES / f"{name}.toml").read_text())
    jsonschema.validate(document, schema)
    document["layer"][0]["nmae"] = "layer"
    with pytest.raises(jsonschema.ValidationError):
        jsonschema.validate(document, schema)


def test_window_narrows_in_tm_only():
    lists = api.find_bands(sample("ka_band_window"), [0.0, 80.0])
    widths = {(found.polarization, found.angle_deg): found.bands[0].width for found in lists}
    assert widths["TM", 80.0] < 0.2 * widths["TM", 0.0]
    assert widths["TE", 80.0] > 0.9 * widths["TE", 0.0]
    plasma = api.describe_stack(sample("ka_band_window")).wires[0].plasma[0]
    assert plasma.frequency == pytest.approx(37.5e9, abs=0.05e9)


def test_absorber_edge_moves_less_in_tm():
    lists = api.find_bands(sample("wire_absorber"), [0.0, 50.0])
    edges = {(found.polarization, found.angle_deg): found.bands[0].lower for found in lists}
    moves = {name: abs(edges[name, 50.0] / edges[name, 0.0] - 1.0) for name in ("TE", "TM")}
    assert moves["TM"] < 0.25 * moves["TE"]


def test_patches_reflect_in_phase_near_12_ghz_and_absorb_at_the_plasma_edge():
    stack = sample("patches_on_wires")
    r = api.solve(stack, np.linspace(11e9, 13e9, 201), 0.0, polarizations=("TE",)).r.ravel()
    crossing = np.flatnonzero((np.diff(np.sign(r.imag)) != 0.0) & (r.real[1:] > 0.0))
    assert len(crossing) == 1
    assert 11e9 + crossing[0] * 1e7 == pytest.approx(11.65e9, abs=0.01e9)
    edge = api.describe_stack(stack).wires[0].plasma[0].frequency
    assert edge == pytest.approx(12.1e9, abs=0.05e9)
    narrow, wide = (found.bands[0] for found in api.find_bands(stack, [8.0, 30.0]) if found.polarization == "TM")
    assert narrow.width < 0.2e9 < wide.width
    assert narrow.lower == pytest.approx(edge, rel=0.01)


def test_glass_table_ends_at_3_um():
    text = (SAMPLES / "gold_nanowires.toml").read_text().replace('"3 um"', '"3.1 um"')
    with pytest.raises(api.StackError, match=r"glass.* is not known at 3\.1 um"):
        api.parse_stack(text, SAMPLES, "gold.toml")


def test_stacked_grids_pass_above_one_edge_in_both_polarizations():
    (te,), (tm,) = (
        [
            found.bands[0]
            for found in api.find_bands(sample("stacked_grids"), [0.0], azimuths_deg=[0.0])
            if found.polarization == p
        ]
        for p in ("TE", "TM")
    )
    assert te.lower == pytest.approx(14.06e9, rel=1e-3)
    assert tm.lower == pytest.approx(te.lower, rel=1e-9)


def test_turned_grids_mix_the_polarizations_and_not_at_45_degrees():
    solver = api.Solver(sample("stacked_grids"))
    cross = {azimuth: solver.solve(18e9, 40.0, azimuth).T[2, 0, 0] for azimuth in (0.0, 20.0, 45.0)}
    assert cross[20.0] > 1e-3
    assert max(cross[0.0], cross[45.0]) < 1e-20


def test_tilted_wires_pass_the_same_power_from_both_sides_with_another_phase():
    text = sample("tilted_wires").text
    ideal = text.replace('metal = "steel"', 'metal = "perfect conductor"').replace("loss_tangent = 3e-4", "")
    for stack, gap in ((api.parse_stack(ideal), 1e-12), (api.parse_stack(text), 0.02)):  # the rest is what losses take
        solver = api.Solver(stack)
        right, left = (solver.solve([10e9, 14e9, 18e9], 40.0, azimuth) for azimuth in (0.0, 180.0))
        assert np.max(abs(right.T[1] - left.T[1])) < gap
        assert np.min(abs(np.angle(right.t[1] / left.t[1]))) > 0.1
    mixing = solver.solve(14e9, 40.0, 90.0)
    assert mixing.T[2, 0, 0] == pytest.approx(mixing.T[3, 0, 0], rel=1e-9)
    assert mixing.T[2, 0, 0] > 0.01


def test_mesh_window_is_shut_below_its_edge_at_every_angle():
    stack = sample("mesh_window")
    response = api.solve(stack, np.linspace(10e9, 20e9, 11), stack.sweep.angles_deg)
    assert response.T.max() < 3e-3
    assert not stack.mixes_polarizations


def test_honeycomb_vent_holds_back_fields_along_its_plates():
    vent = sample("honeycomb_vent")
    along, across = (api.solve(vent, 10e9, 20.0, azimuth_deg=azimuth).T[:, 0, 0] for azimuth in (0.0, 90.0))
    assert along[1] < 1e-7
    assert across[0] < 1e-7
    assert along[0] > 0.999
    assert across[1] > 0.9


def test_negative_index_band_needs_wires_that_the_rings_do_not_enclose():
    panel = sample("negative_index")
    (found,) = [one for one in api.find_bands(panel, [0.0]) if one.polarization == "TM"]
    (band,) = found.bands
    assert 10.0e9 < band.lower < band.upper < 11.5e9  # mu_yy is negative from 10 to 11.55 GHz
    closed = api.parse_stack(panel.text.replace('axis = "x"', 'axis = "x"\ninductance = "host"'))
    inside = np.linspace(10.2e9, 10.9e9, 30)
    assert api.solve(panel, inside, 0.0).T[1].max() > 0.8
    assert api.solve(closed, inside, 0.0).T[1].max() < 0.2
