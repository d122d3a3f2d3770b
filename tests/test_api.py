"""The front door, as somebody with a notebook uses it."""

import inspect
import re
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest
from numpy.testing import assert_array_equal

from slabsim import api
from tests.cli.conftest import STACK, SWEEP

NOTEBOOK = """\
from slabsim import api
stack = api.read_stack("slab.toml")
response = api.solve(stack, [30e9, 35e9], [0.0, 45.0])
report = api.sweep(stack, "slab.h5", replace=True)
bands = api.find_bands(stack, angles_deg=[0, 30], level=api.read_level("-3 dB"))
comparison = api.compare_models(stack, angles_deg=[30])
api.draw_map("slab.h5", "slab.png")
lost = api.absorbed_by_element(stack, 30e9, 45.0, "TM")
with api.open_map("slab.h5") as found: powers = found.read("transmittance", "TM")
print(response.T.shape, report.is_complete, len(bands), comparison.verdicts["TE"][:17], powers.shape, lost.shape)
"""


@pytest.fixture
def stack(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    Path("slab.toml").write_text(STACK + SWEEP)
    return api.read_stack("slab.toml")


def test_every_name_of_the_front_door_exists_and_is_explained():
    assert api.__all__ == sorted(api.__all__)
    for name in api.__all__:
        found = getattr(api, name)
        text = inspect.getdoc(found)
        assert text, name
        assert len(text.split()) >= 4, name
        assert not text.startswith(f"{name}("), name  # what dataclass writes by itself


def test_functions_of_the_front_door_name_their_arguments():
    for name in api.__all__:
        found = getattr(api, name)
        if not inspect.isfunction(found):
            continue
        signature = inspect.signature(found)
        assert all(p.annotation is not inspect.Parameter.empty for p in signature.parameters.values()), name
        assert signature.return_annotation is not inspect.Signature.empty, name


def test_a_notebook_of_ten_lines_runs(stack):
    assert len(NOTEBOOK.splitlines()) == 10
    done = subprocess.run([sys.executable, "-W", "error", "-c", NOTEBOOK], capture_output=True, text=True, check=False)
    assert done.stderr == ""
    assert done.stdout == "(2, 2, 2) True 4 Local model exact (41, 4) (1, 1)\n"
    assert Path("slab.png").stat().st_size > 10_000


def test_the_example_of_the_docstring_names_what_exists():
    used = set(re.findall(r"api\.([a-z_]+)\(", api.__doc__))
    assert used
    assert used <= set(api.__all__)


def test_solve_takes_another_model_and_polarization(stack):
    full = api.solve(stack, [30e9], [45.0], "local")
    assert_array_equal(api.solve(stack, 30e9, 45.0, "local", ("TM",)).t[0], full.t[1])
    assert abs(full.t - api.solve(stack, [30e9], [45.0]).t)[1].max() > 1e-3


def test_a_map_is_told_by_its_content(stack):
    api.sweep(stack, "slab.h5")
    Path("slab.h5").rename("map.dat")
    assert api.is_map("map.dat")
    assert not api.is_map("slab.toml")
    assert not api.is_map("none")
    assert api.load_stack("map.dat").sweep.frequencies.size == 41


def test_what_goes_wrong_is_an_error_of_slabsim(stack):
    api.sweep(stack, "slab.h5")
    wrong = [
        (api.StackError, lambda: api.read_stack("none.toml")),
        (api.StackError, lambda: api.parse_stack("x = ", Path(), "x.toml")),
        (api.MapError, lambda: api.open_map("slab.toml")),
        (api.MapError, lambda: api.load_stack("none.h5")),
        (api.MapError, lambda: api.sweep(stack, "slab.h5")),
        (api.InputError, lambda: api.read_level("2")),
        (api.InputError, lambda: api.solve(stack, [30e9], [90.0])),
        (api.InputError, lambda: api.solve(stack, [-1.0], [0.0])),
        (api.InputError, lambda: api.compare_models(stack, tolerance=0.0)),
        (api.InputError, lambda: api.find_bands(stack, angles_deg=[np.nan])),
        (api.InputError, lambda: api.draw_map("slab.h5", "x.bmp")),
        (api.InputError, lambda: api.draw_map("slab.h5", "x.png", "S")),
    ]
    for kind, call in wrong:
        with pytest.raises(kind):
            call()
        assert issubclass(kind, api.SlabsimError)


def test_unknown_quantity_of_a_map_names_the_choices(stack):
    api.sweep(stack, "slab.h5")
    with pytest.raises(api.InputError, match=r"slab\.h5: quantity 'S'; it must be one of T, R, A"):
        api.draw_map("slab.h5", "x.png", "S")


def test_title_of_a_map_names_model_and_state(stack, monkeypatch):
    titles = []
    monkeypatch.setattr(api, "map_figure", lambda path, title, *rest: titles.append(title))
    api.sweep(stack, "slab.h5")
    api.draw_map("slab.h5", "x.png")
    with pytest.raises(api.SweepInterrupted):
        api.sweep(stack, "part.h5", stop=lambda: True)
    api.draw_map("part.h5", "x.png")
    assert titles == ["slab.toml, nonlocal model", "slab.toml, nonlocal model (unfinished)"]


def test_stored_comparison_is_read_back(stack):
    api.sweep(stack, "slab.h5")
    comparison = api.compare_models(stack, angles_deg=[30.0])
    api.store_comparison(comparison, "slab.h5")
    with api.open_map("slab.h5") as found:
        assert_array_equal(found.read_comparison("difference", "TM"), comparison.difference[1])
        assert found.comparison_attributes()["verdict_TM"] == comparison.verdicts["TM"]
