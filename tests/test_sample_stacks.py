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
NAMES = ["gold_nanowires", "ka_band_window", "patches_on_wires", "wire_absorber"]


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
    assert "TM: Local model " in compared.out
    for figure in (f"{name}.png", f"{name}_compare.png"):
        assert struct.unpack(">II", Path(figure).read_bytes()[16:24]) == (1680, 1080)
    with api.open_map(map_file) as found:
        assert found.is_complete
        for quantity in ("reflectance", "absorptance"):
            powers = found.read(quantity, "TM")
            assert powers.min() > -1e-12
            assert powers.max() < 1.0 + 1e-12


@pytest.mark.parametrize("name", NAMES)
def test_sample_satisfies_the_schema(slabsim, name):  # noqa: F811
    schema = json.loads(slabsim("schema").out)
    jsonschema.Draft202012Validator.check_schema(schema)
    document = tomllib.loads((SAMPLES / f"{name}.toml").read_text())
    jsonschema.validate(document, schema)
    document["layer"][0]["thicknes"] = "1 mm"
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
