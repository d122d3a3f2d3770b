"""The commands on stacks whose polarizations mix, over azimuth, and with grids and plates."""

import csv
from pathlib import Path

import h5py
import numpy as np
import pytest
import xarray
from numpy.testing import assert_allclose

from slabsim import api
from tests.cli.test_commands import rows_of

COPPER = '[material.copper]\nconductivity = "5.8e7 S/m"\n'
SLAB = (
    COPPER
    + '[[layer]]\nname = "slab"\nmaterial = "vacuum"\nthickness = "6 mm"\n'
    + '[[layer.wires]]\naxis = { tilt = "40 deg" }\npitch = "3 mm"\nradius = "60 um"\nmetal = "copper"\n'
)
GRID = COPPER + '[[layer]]\ngrid = { axis = "x", pitch = "10 mm", radius = "0.1 mm", metal = "copper" }\n'
SWEEP = (
    '[sweep]\nspectrum = { from = "8 GHz", to = "28 GHz", points = 41 }\n'
    'angle = { from = "0 deg", to = "60 deg", points = 4 }\nazimuth = { values = ["0 deg", "30 deg", "90 deg"] }\n'
)


@pytest.fixture
def tilted_map(slabsim, folder):
    Path("tilted.toml").write_text(SLAB + SWEEP)
    ended = slabsim("sweep", "tilted.toml")
    assert ended.out.startswith(
        "tilted.h5: 3 of 3 blocks are done\n492 points by 2 polarizations and their cross terms, "
    )
    return Path("tilted.h5")


def test_a_map_holds_the_cross_terms_and_every_azimuth(tilted_map):
    stack = api.load_stack(tilted_map)
    with api.open_map(tilted_map) as found:
        assert found.polarizations == ("TE", "TM")
        assert found.channels == ("TE", "TM", "TE_to_TM", "TM_to_TE")
        for row, azimuth in enumerate(found.azimuths_deg):
            response = api.solve(stack, found.frequencies, found.angles_deg, azimuth_deg=azimuth)
            for k, channel in enumerate(found.channels):
                assert_allclose(found.read("transmittance", channel, row), response.T[k], atol=1e-15)
                assert_allclose(found.read_amplitude("r", channel, row), response.r[k], atol=1e-15)
            assert_allclose(found.read("absorptance", "TM", row), response.A[1], atol=1e-15)
        with pytest.raises(api.InputError, match=r"polarization 'TE_to_TM': .* has TE, TM"):
            found.read("absorptance", "TE_to_TM")


def test_xarray_finds_the_cross_terms_by_their_codes(tilted_map):
    with xarray.open_dataset(tilted_map, engine="h5netcdf") as data:
        assert list(data.polarization.values) == [0, 1, 2, 3]
        assert data.polarization.attrs["flag_meanings"] == "TE TM TE_to_TM TM_to_TE"
        assert list(data.incident.values) == [0, 1]
        total = data.transmittance.sum("polarization") + data.reflectance.sum("polarization")
        assert_allclose(total + data.absorptance.sum("incident"), 2.0, atol=1e-13)
    with h5py.File(tilted_map) as file:
        assert {"transmittance_TE", "transmittance_TM", "transmittance_TE_to_TM"} < set(file["entry/plot"])
        assert file["entry/plot"].attrs["signal"] == "transmittance_TM"


def test_one_incident_polarization_has_one_cross_term(slabsim, folder):
    Path("te.toml").write_text(SLAB + SWEEP + 'polarization = "TE"\n')
    assert "492 points by 1 polarization and their cross terms" in slabsim("sweep", "te.toml").out
    with api.open_map("te.h5") as found:
        assert found.channels == ("TE", "TE_to_TM")
    with h5py.File("te.h5") as file:
        assert list(file["polarization"]) == [0, 2]


def test_bands_are_listed_by_azimuth_and_cross_terms_on_request(slabsim, tilted_map):
    plain = slabsim("passbands", tilted_map, "--angle", 40, "--csv", "bands.csv")
    assert "azimuth (deg)" in plain.out
    assert "TE to TM" not in plain.out
    with open("bands.csv") as file:
        assert {row["azimuth (deg)"] for row in csv.DictReader(file)} == {"0", "30", "90"}
    crossed = slabsim("passbands", tilted_map, "--angle", 40, "--azimuth", 30, "--cross").out
    assert "TE to TM" in crossed
    (first,) = [row for row in rows_of(crossed, "TE") if row[1:4] == ["to", "TM", "40"]]
    bands = api.find_bands(api.load_stack(tilted_map), [40.0], azimuths_deg=[30.0], cross=True)
    band = next(found for found in bands if found.polarization == "TE_to_TM").bands[0]
    assert first[6] == f"{band.upper / 1e9:.7g}" or first[5] == f"{band.lower / 1e9:.7g}"


def test_bands_in_the_other_polarization_solve_the_level(tilted_map):
    stack = api.load_stack(tilted_map)
    (found,) = [
        one for one in api.find_bands(stack, [40.0], azimuths_deg=[90.0], cross=True) if one.polarization == "TM_to_TE"
    ]
    band = found.bands[0]
    for edge, is_cut in ((band.lower, band.cut_below), (band.upper, band.cut_above)):
        if not is_cut:
            assert api.solve(stack, edge, 40.0, azimuth_deg=90.0).T[3, 0, 0] == pytest.approx(found.level, rel=1e-9)


def test_cross_terms_that_are_zero_have_no_bands(slabsim, tilted_map):
    out = slabsim("passbands", tilted_map, "--angle", 40, "--azimuth", 0, "--cross").out
    assert "no band: T is at most" in out


def test_losses_add_up_to_all_of_the_power(slabsim, tilted_map):
    ended = slabsim("losses", tilted_map, "--frequency", "12 GHz", "--angle", 40, "--azimuth", 30)
    assert ended.code == 0
    assert ended.out.startswith("tilted.toml: 12 GHz, 40 deg, azimuth 30 deg, nonlocal model\n")
    assert rows_of(ended.out, "sum")[0][1:] == ["100", "100"]
    budget = api.power_budget(api.load_stack(tilted_map), 12e9, 40.0, 30.0)
    assert_allclose(budget.totals, 1.0, atol=1e-12)
    (row,) = rows_of(ended.out, "1")
    assert row[1] == '"slab"'
    assert_allclose([float(cell) for cell in row[2:]], 100 * np.array(budget.losses[0].shares), rtol=1e-4)
    assert "wires 1" in ended.out


@pytest.mark.parametrize("text", ["25 mm", "0.4 cm^-1", "0.0496 meV"])
def test_losses_take_any_spectral_unit(slabsim, tilted_map, text):
    assert slabsim("losses", tilted_map, "--frequency", text).code == 0


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        (("--frequency", "12"), '"12" has no unit'),
        (("--frequency", "12 mm/s"), "12 mm/s"),
        (("--frequency", "-1 GHz"), "a frequency must be greater than zero"),
        (("--frequency", "12 GHz", "--angle", "95"), "every angle must satisfy 0 <= angle < 90"),
        (("--frequency", "12 GHz", "--azimuth", "nan"), "azimuth_deg = nan"),
    ],
)
def test_losses_at_a_point_that_is_none(slabsim, tilted_map, arguments, message):
    ended = slabsim("losses", tilted_map, *arguments)
    assert ended.code == 1
    assert message in ended.err


def test_plots_of_an_azimuth_and_over_azimuth(slabsim, tilted_map):
    pytest.importorskip("matplotlib")
    for options in (("--azimuth", 30), ("--over", "azimuth", "--angle", 40), ("--quantity", "A", "--azimuth", 90)):
        ended = slabsim("plot", tilted_map, *options, "-o", "figure.png")
        assert (ended.code, ended.out) == (0, "figure.png\n")
    assert "azimuth = 120 deg; the map has 0 to 90 deg" in slabsim("plot", tilted_map, "--azimuth", 120).err
    assert (
        "with --over azimuth there is one angle"
        in slabsim("plot", tilted_map, "--over", "azimuth", "--angle", 20, "--angle", 40).err
    )
    assert "it must be one of angle, azimuth" in slabsim("plot", tilted_map, "--over", "frequency").err


def test_comparison_at_an_azimuth(slabsim, tilted_map):
    ended = slabsim("compare", tilted_map, "--angle", 40, "--azimuth", 30)
    assert ended.code == 0
    assert ended.out.startswith("tilted.toml: level 0.5 of peak, azimuth 30 deg\n")
    for words in ("TE: Local model", "TM: Local model", "TE to TM: Local model", "TM to TE: Local model"):
        assert words in ended.out
    with api.open_map(tilted_map) as found:
        assert found.read_comparison("difference", "TE_to_TM").shape == (41, 4)
        assert found.comparison_attributes()["azimuth"] == 30.0
    along = slabsim("compare", tilted_map, "--angle", 40, "--azimuth", 0).out
    assert "TE to TM" not in along  # nothing goes that way


def test_comparison_of_metal_backed_mixing_stacks_takes_the_absorptance(slabsim, folder):
    Path("backed.toml").write_text('back = "perfect conductor"\n' + SLAB + SWEEP)
    assert slabsim("sweep", "backed.toml").code == 0
    assert slabsim("compare", "backed.h5", "--angle", 40).code == 0
    with api.open_map("backed.h5") as found:
        assert found.read_comparison("difference", "TM").shape == (41, 4)


def test_wires_parallel_to_the_faces_are_judged_by_the_wavenumber_along_them(slabsim, folder):
    flat = SLAB.replace('axis = { tilt = "40 deg" }', 'axis = "x"')
    Path("flat.toml").write_text(flat + SWEEP)
    out = slabsim("compare", "flat.toml", "--angle", 40).out
    assert "depends on the wavenumber along them" in out
    out = slabsim("compare", "flat.toml", "--angle", 40, "--azimuth", 90, "--replace").out
    assert "Local model exact: the wave has no wavenumber along the wires, which lie parallel to the faces" in out


def test_points_beyond_the_onset_of_diffraction_are_counted_not_listed(slabsim, folder):
    Path("grid.toml").write_text(GRID + SWEEP)
    out = slabsim("sweep", "grid.toml").out
    assert "responses lie beyond the onset of diffraction of a grid or of plates and are NaN in the map" in out
    assert "are not finite" not in out
    with api.open_map("grid.h5") as found:
        T = found.read("transmittance", "TM", 2)
        assert found.is_complete
        # the onset at azimuth 90 deg: c/(a (1 + sin))
        onset = 299_792_458 / 10e-3 / (1 + np.sin(np.deg2rad(found.angles_deg)))
        assert np.array_equal(np.isnan(T), found.frequencies[:, None] >= onset)
    described = slabsim("describe", "grid.toml").out
    assert (
        "Diffraction, or a second mode between plates, sets in at 29.9792 GHz and 16.0658 GHz (0 and 60 deg)"
        in described
    )
    lost = slabsim("losses", "grid.toml", "--frequency", "27 GHz", "--angle", 60, "--azimuth", 90)
    assert lost.code == 1
    assert "beyond the onset of diffraction" in lost.err


def test_describe_says_what_every_geometry_is(slabsim, folder):
    text = (
        COPPER
        + "[material.crystal]\npermittivity = { xx = 2.0, yy = 3.0, zz = 2.5 }\n"
        + '[[layer]]\nname = "turned"\nmaterial = "crystal"\nthickness = "2 mm"\nrotation = "30 deg"\n'
        + '[[layer.wires]]\naxis = "y"\npitch = "3 mm"\nradius = "60 um"\nmetal = "copper"\n'
        + '[[layer.wires]]\naxis = { tilt = "20 deg", azimuth = "45 deg" }\n'
        + 'pitch = "3 mm"\nradius = "60 um"\nmetal = "copper"\n'
        + '[[layer]]\nname = "mesh"\nmaterial = "vacuum"\nthickness = "6 mm"\n'
        + 'mesh = { pitch = "3 mm", radius = "60 um", metal = "copper" }\n'
        + '[[layer]]\nname = "vent"\nthickness = "6 mm"\nplates = { spacing = "4 mm", normal = "x" }\n'
        + GRID.replace(COPPER, "")
        + '[sweep]\nspectrum = { from = "8 GHz", to = "20 GHz", points = 3 }\nangle = "20 deg"\n'
    )
    Path("all.toml").write_text(text)
    out = slabsim("describe", "all.toml").out
    for words in (
        "along y; tilt 20 deg, azimuth 45 deg, ends open, open; anisotropic, mean eps; turned by 30 deg",
        "normal to x, spacing 4 mm, cut-off 37.4741 GHz",
        "along x, pitch 10 mm, radius 100 um",
        'Wires 1 of "turned"',
        'Wires 2 of "turned"',
        'Mesh of "mesh"',
        "stiffness l0                        2.199",
    ):
        assert words in out
    assert out.count("TEM loss over one pass") == 1  # only the tilted set crosses its layer alone
