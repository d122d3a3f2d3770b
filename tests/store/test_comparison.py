"""Differences stored beside the data."""

import numpy as np
import pytest
import xarray
from nexusformat.nexus.validate import validate_file

from slabsim.errors import InputError, MapError
from slabsim.store.comparison import Field, write_comparison
from slabsim.store.reader import open_map
from tests.store.demo import contents, demo_stack, write_map


@pytest.fixture
def path(tmp_path):
    write_map(tmp_path / "map.h5", demo_stack())
    return tmp_path / "map.h5"


def differences():
    rng = np.random.default_rng(3)
    return {
        "transmittance_difference": Field(rng.normal(size=(2, 12, 5)), "T(nonlocal) - T(local)"),
        "phase_difference": (rng.normal(size=(2, 12, 5)), "arg t(nonlocal) - arg t(local)", "rad"),
    }


def test_differences_come_back_and_the_rest_stays(path):
    before, fields = contents(path), differences()
    write_comparison(path, fields, {"other_model": "local", "largest": 0.25})
    assert contents(path) == before
    assert validate_file(str(path))[1] == 0
    with open_map(path) as found:
        for row, polarization in enumerate(("TE", "TM")):
            for name, (values, *_) in fields.items():
                np.testing.assert_array_equal(found.read_comparison(name, polarization), values[row])
        assert found.comparison_attributes()["other_model"] == "local"
        assert found.comparison_attributes()["largest"] == 0.25
    with xarray.open_dataset(path, group="entry/comparison", engine="h5netcdf") as opened:
        assert opened.phase_difference.dims == ("polarization", "frequency", "angle")
        assert opened.phase_difference.attrs["units"] == "rad"


def test_a_second_comparison_takes_the_place_of_the_first(path):
    write_comparison(path, differences(), {"other_model": "local"})
    size = path.stat().st_size
    write_comparison(path, {"other": Field(np.zeros((2, 12, 5)), "other")}, {})
    assert path.stat().st_size <= size + 4096
    with open_map(path) as found:
        np.testing.assert_array_equal(found.read_comparison("other", "TM"), np.zeros((12, 5)))
        assert "other_model" not in found.comparison_attributes()
        with pytest.raises(InputError, match=r"comparison 'phase_difference': .* has other"):
            found.read_comparison("phase_difference", "TM")


def test_a_map_without_comparison_says_so(path):
    with open_map(path) as found, pytest.raises(MapError, match="holds no comparison; make one first"):
        found.read_comparison("x", "TM")


def test_a_field_of_another_grid_is_refused_and_the_map_untouched(path):
    before = path.read_bytes()
    with pytest.raises(InputError, match=r"field 'x' has shape \(2, 3, 5\); .* needs \(2, 12, 5\)"):
        write_comparison(path, {"x": Field(np.zeros((2, 3, 5)), "x")}, {})
    with pytest.raises(InputError, match="needs at least one field"):
        write_comparison(path, {}, {})
    assert path.read_bytes() == before


def test_a_failure_leaves_the_map_as_it_was(path, monkeypatch):
    before = path.read_bytes()

    def fail(*args):
        raise OSError("broken")

    monkeypatch.setattr("slabsim.store.comparison._write", fail)
    with pytest.raises(MapError, match="broken"):
        write_comparison(path, differences(), {})
    assert path.read_bytes() == before
    assert [file.name for file in path.parent.iterdir()] == ["map.h5"]
