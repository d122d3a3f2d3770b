"""The layout of a map, as plain HDF5, NeXus and netCDF readers see it."""

import h5py
import numpy as np
import pytest
import xarray
from nexusformat.nexus.validate import validate_file

from slabsim.store import layout
from slabsim.sweeps.plan import SweepPlan
from tests.store.demo import TABLE, TEXT, demo_stack, expected, write_map

POWERS = ["transmittance", "reflectance", "absorptance"]
AMPLITUDES = ["t_real", "t_imag", "r_real", "r_imag"]


@pytest.fixture
def demo(tmp_path):
    stack = demo_stack(n_azimuths=2)
    write_map(tmp_path / "map.h5", stack)
    return stack, tmp_path / "map.h5"


def test_xarray_opens_a_map_by_its_path_alone(demo):
    stack, path = demo
    with xarray.open_dataset(path, engine="h5netcdf") as opened:
        np.testing.assert_array_equal(opened.frequency, stack.sweep.frequencies)
        np.testing.assert_array_equal(opened.angle, stack.sweep.angles_deg)
        np.testing.assert_array_equal(opened.azimuth, stack.sweep.azimuths_deg)
        np.testing.assert_array_equal(opened.polarization, [0, 1])
        assert opened.frequency.attrs["units"] == "Hz"
        assert set(opened.data_vars) == {*POWERS, *AMPLITUDES}
        for name in [*POWERS, *AMPLITUDES]:
            second = "incident" if name == "absorptance" else "polarization"
            assert opened[name].dims == ("azimuth", second, "frequency", "angle")
            np.testing.assert_array_equal(opened[name], expected(stack, name))


def test_a_map_is_valid_nexus(demo):
    _, path = demo
    n_warnings, n_errors = validate_file(str(path))
    assert n_errors == 0
    assert n_warnings == 2 + 12  # root attributes slabsim_format and Conventions; soft links at the root


@pytest.mark.parametrize("options", [{"back": None}, {"polarizations": ("TM",)}, {"store": ("amplitude",)}])
def test_reduced_maps_are_valid_nexus_and_netcdf(tmp_path, options):
    stack = demo_stack(**options)
    write_map(tmp_path / "map.h5", stack)
    assert validate_file(str(tmp_path / "map.h5"))[1] == 0
    with xarray.open_dataset(tmp_path / "map.h5", engine="h5netcdf") as opened:
        assert "r_real" in opened
        np.testing.assert_array_equal(opened.r_real, expected(stack, "r_real"))


def test_viewers_find_a_two_dimensional_default_plot(demo):
    stack, path = demo
    with h5py.File(path) as file:
        plot = file["entry"][file["entry"].attrs["default"]]
        assert plot.attrs["NX_class"] == "NXdata"
        assert plot.attrs["signal"] == "transmittance_TM"
        assert list(plot.attrs["auxiliary_signals"]) == ["transmittance_TE"]
        assert list(plot.attrs["axes"]) == ["frequency", "angle"]
        assert plot["frequency"] == file["entry/data/frequency"]  # one object, two names
        for row, polarization in enumerate(("TE", "TM")):
            copy = plot[f"transmittance_{polarization}"]
            np.testing.assert_array_equal(copy, expected(stack, "transmittance")[0, row])


def test_every_quantity_is_described(demo):
    _, path = demo
    with h5py.File(path) as file:
        data = file["entry/data"]
        assert data.attrs["signal"] == "transmittance"
        assert list(data.attrs["axes"]) == ["azimuth", "polarization", "frequency", "angle"]
        assert [data.attrs[f"{axis}_indices"] for axis in data.attrs["axes"]] == [0, 1, 2, 3]
        assert data.attrs["time_convention"] == "exp(-i*omega*t)"
        assert "front face" in data.attrs["amplitude"]
        assert data["polarization"].attrs["flag_meanings"] == "TE TM"
        assert data["polarization"].dtype == np.int8
        for name in [*POWERS, *AMPLITUDES]:
            assert data[name].attrs["units"] == "1"
            assert data[name].attrs["long_name"]
            assert np.isnan(data[name].attrs["_FillValue"])
            assert data[name].fletcher32
            assert data[name].chunks == (1, 1, 5, 3)
            assert [dimension[0].name.rsplit("/")[-1] for dimension in data[name].dims] == data[name].attrs[
                "coordinates"
            ].split()
            assert file.get(name, getlink=True).path == f"/entry/data/{name}"


def test_the_map_keeps_stack_tables_and_origin(demo):
    _, path = demo
    with h5py.File(path) as file:
        assert file.attrs["slabsim_format"] == layout.FORMAT == "1.0"
        assert file["entry/process/stack/data"].asstr()[()] == TEXT
        assert file["entry/process/stack/file_name"].asstr()[()] == "demo.toml"
        assert file["entry/process/stack/type"].asstr()[()] == "application/toml"
        assert file["entry/process/table_1/data"].asstr()[()] == TABLE
        assert file["entry/process/models/wire_medium"].asstr()[()] == "nonlocal"
        assert file["entry/process/models/plasma_wavenumber"].asstr()[()] == "lattice"
        assert {"python", "numpy", "numba", "h5py"} <= set(file["entry/process/environment"])
        assert file["entry/progress/state"].asstr()[()] == "complete"
        assert file["entry/end_time"].asstr()[()] >= file["entry/start_time"].asstr()[()]


def test_a_metal_backed_stack_has_no_transmission(tmp_path):
    stack = demo_stack(back=None)
    write_map(tmp_path / "map.h5", stack)
    with h5py.File(tmp_path / "map.h5") as file:
        assert {q.name for q in layout.quantities(stack)} == {"reflectance", "absorptance", "r_real", "r_imag"}
        assert not {"transmittance", "t_real", "t_imag"} & (set(file["entry/data"]) | set(file))
        assert file["entry/data"].attrs["signal"] == "reflectance"
        assert file["entry/plot"].attrs["signal"] == "reflectance_TM"
        np.testing.assert_array_equal(file["entry/plot/reflectance_TE"], expected(stack, "reflectance")[0, 0])


@pytest.mark.parametrize(
    ("store", "kept", "signal"),
    [
        (("power",), POWERS, "transmittance"),
        (("amplitude",), AMPLITUDES, "t_real"),
        (("amplitude", "power"), POWERS + AMPLITUDES, "transmittance"),
    ],
)
def test_the_sweep_says_which_quantities_are_kept(tmp_path, store, kept, signal):
    write_map(tmp_path / "map.h5", demo_stack(store=store))
    with h5py.File(tmp_path / "map.h5") as file:
        assert file["entry/data"].attrs["signal"] == signal
        assert {name for name, item in file["entry/data"].items() if item.ndim == 4} == set(kept)
        assert ("incident" in file["entry/data"]) == ("power" in store)
        assert file["entry/plot"].attrs["signal"] == "transmittance_TM"


@pytest.mark.parametrize(("polarizations", "codes"), [(("TM",), [1]), (("TE",), [0]), (("TM", "TE"), [1, 0])])
def test_polarizations_are_stored_as_codes_in_the_order_of_the_sweep(tmp_path, polarizations, codes):
    stack = demo_stack(polarizations=polarizations)
    write_map(tmp_path / "map.h5", stack)
    with h5py.File(tmp_path / "map.h5") as file:
        assert list(file["entry/data/polarization"]) == list(file["entry/data/incident"]) == codes
        np.testing.assert_array_equal(file["entry/data/transmittance"], expected(stack, "transmittance"))
        for row, name in enumerate(polarizations):
            copy = file[f"entry/plot/transmittance_{name}"]
            np.testing.assert_array_equal(copy, expected(stack, "transmittance")[0, row])


def test_a_single_point_makes_a_valid_map(tmp_path):
    stack = demo_stack(1, 1)
    write_map(tmp_path / "map.h5", stack)
    assert validate_file(str(tmp_path / "map.h5"))[1] == 0
    with xarray.open_dataset(tmp_path / "map.h5", engine="h5netcdf") as opened:
        np.testing.assert_array_equal(opened.transmittance, expected(stack, "transmittance"))


def test_compression_changes_the_file_and_no_value(tmp_path):
    stack = demo_stack(200, 50)
    write_map(tmp_path / "plain.h5", stack, SweepPlan.of(stack.sweep))
    write_map(tmp_path / "small.h5", stack, SweepPlan.of(stack.sweep), compress=True)
    with h5py.File(tmp_path / "small.h5") as small, h5py.File(tmp_path / "plain.h5") as plain:
        for name in [*POWERS, *AMPLITUDES]:
            assert (small[name].compression, small[name].compression_opts, small[name].shuffle) == ("gzip", 1, True)
            assert plain[name].compression is None
            np.testing.assert_array_equal(small[name], plain[name])
    assert (tmp_path / "small.h5").stat().st_size < (tmp_path / "plain.h5").stat().st_size
