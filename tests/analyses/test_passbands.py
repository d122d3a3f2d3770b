import mpmath as mp
import numpy as np
import pytest
from numpy.testing import assert_allclose

from slabsim.analyses.passbands import Level, _bands_of, find_bands, read_level
from slabsim.errors import InputError
from slabsim.stack.sample import Layer
from tests.engine.twins import GROUNDED, medium, reference, stack, wires

C0 = 299_792_458


class Shape:
    """A spectrum given by its formula, in place of a stack's."""

    def __init__(self, amplitude):
        self.amplitude = amplitude
        self.angle_deg, self.azimuth_deg, self.quantity, self.noise = 0.0, 0.0, "T", 0.0

    def power(self, f):
        return abs(self.amplitude(np.asarray(f))) ** 2


def butterworth(order, centre, half_width):
    """Product of 1/(x - pole), |amplitude|^2 = 1/(1 + x^(2 n)); textbook definition of the Butterworth filter."""
    poles = np.exp(1j * np.pi * (2 * np.arange(1, order + 1) - 1 + order) / (2 * order))  # left half-plane of s = i x

    def amplitude(f):
        x = (f - centre) / half_width
        return np.prod([1.0 / (1j * x - pole) for pole in poles], axis=0)

    return Shape(amplitude)


def cavity(mirror, frequencies=None):
    """A resonator between two opaque mirrors; its lines narrow exponentially with the thickness of the mirrors."""
    grid = np.linspace(5e9, 40e9, 351) if frequencies is None else frequencies
    m = Layer("mirror", medium(-30.0), mirror)
    return stack(m, Layer("cavity", medium(2.25), 6e-3), m, frequencies=grid, polarizations=("TE",))


@pytest.mark.parametrize("order", [1, 2, 3, 5])
def test_butterworth_has_the_edges_and_the_shape_factor_of_its_formula(order):
    found = _bands_of(butterworth(order, 10e9, 0.3e9), "TE", np.linspace(5e9, 15e9, 101), Level(0.5, of_peak=False))
    (band,) = found.bands
    assert_allclose([band.lower, band.upper], [9.7e9, 10.3e9], rtol=1e-9)
    assert_allclose(band.shape_factor, 19.0 ** (1 / (2 * order)), rtol=1e-9)  # 1/(1 + x^2n) = 0.05
    assert band.insertion_loss_db == pytest.approx(0.0, abs=1e-12)
    assert band.ripple_db == 0.0


@pytest.mark.parametrize("mirror", [1e-3, 2e-3, 4e-3, 6e-3])
def test_lines_far_narrower_than_the_grid_are_found_and_are_lorentzian(mirror):
    stack_ = cavity(mirror)
    (found,) = find_bands(stack_)
    step = 1e8
    band = found.bands[0]
    assert band.width < 2 * step
    if mirror > 5e-3:
        assert band.width < 1e-6 * step
    assert band.peak == pytest.approx(1.0, abs=1e-6)  # symmetric and lossless
    assert band.shape_factor == pytest.approx(np.sqrt(19.0), rel=0.03)


def test_edges_hold_on_the_independent_reference_to_one_part_in_a_billion():
    stack_ = cavity(1e-3)
    (found,) = find_bands(stack_)
    for band in found.bands:
        for edge, rises in ((band.lower, True), (band.upper, False)):
            below, above = (reference(stack_, edge * (1 + s), 0.0, "TE").T - found.level for s in (-1e-9, 1e-9))
            assert (below < 0 < above) if rises else (below > 0 > above)


def test_edges_do_not_depend_on_the_grid():
    coarse, fine = (find_bands(cavity(1e-3, np.linspace(5e9, 40e9, n)))[0].bands for n in (40, 3001))
    assert len(coarse) == len(fine) == 2
    for a, b in zip(coarse, fine, strict=True):
        assert_allclose([a.lower, a.upper, a.shape_factor], [b.lower, b.upper, b.shape_factor], rtol=1e-9)


def test_fringes_of_a_plate_follow_the_tilt_law():
    # filter handbooks: lambda/lambda0 = sqrt(1 - sin^2/n^2); here n = 1.8 at 10, 20, 30 deg
    thickness = C0 / 10e9 / 1.8 / 2
    plate = stack(
        Layer("plate", medium(1.8**2), thickness), frequencies=np.linspace(8e9, 12e9, 41), polarizations=("TE",)
    )
    lists = find_bands(plate, [0, 10, 20, 30])
    shifts = [lists[0].bands[0].peak_frequency / found.bands[0].peak_frequency for found in lists[1:]]
    assert_allclose(shifts, [0.9953357753, 0.9817819246, 0.9606453592], atol=1e-7)


def test_ripple_is_that_of_the_airy_formula():
    # n = 1.5 plate: T between 1 and [2 n/(n^2 + 1)]^2 = 0.8520710059 (textbook)
    plate = stack(Layer("plate", medium(2.25), 0.1), frequencies=np.linspace(5e9, 9e9, 30), polarizations=("TE",))
    (found,) = find_bands(plate, [0], Level(0.5, of_peak=False))
    (band,) = found.bands
    assert band.cut_below
    assert band.cut_above
    assert band.ripple_db == pytest.approx(-10 * np.log10(0.8520710059), abs=1e-9)


def test_a_band_cut_by_the_sweep_says_so_and_ends_at_its_end():
    (found,) = find_bands(cavity(1e-3, np.linspace(13.6e9, 20e9, 65)))
    band = found.bands[0]
    assert (band.cut_below, band.cut_above) == (True, False)
    assert band.lower == 13.6e9
    assert np.isnan(band.shape_factor)


def test_no_band_where_the_level_is_not_reached():
    opaque = stack(Layer("metal", medium(-30.0), 5e-3), frequencies=np.linspace(5e9, 10e9, 20))
    assert all(not found.bands for found in find_bands(opaque, [0], Level(0.5, of_peak=False)))


def test_a_metal_backed_stack_is_judged_by_its_absorption_and_refuses_transmission():
    film = stack(Layer("lossy", medium(2 + 1j), 5e-3), back=None, frequencies=np.linspace(5e9, 20e9, 40))
    assert {found.quantity for found in find_bands(film)} == {"A"}
    with pytest.raises(InputError, match="nothing is transmitted into a perfect conductor; ask for R or A"):
        find_bands(film, quantity="T")


def test_the_rounding_of_a_lossless_absorptance_is_no_band():
    held = Layer("wires", medium(1.07), 4e-3, wires(2e-3, 50e-6, back=GROUNDED))
    lossless = stack(held, back=None, frequencies=np.linspace(20e9, 60e9, 41))
    for found in find_bands(lossless, [20.0]):
        assert found.bands == ()
        assert found.peak < 1e-11


def test_one_frequency_is_no_spectrum():
    with pytest.raises(InputError, match="one frequency; a pass band needs a range"):
        find_bands(stack(Layer("plate", medium(2.0), 1e-3)))


def test_endless_resonances_of_lossless_local_wires_come_to_an_end():
    f = np.linspace(30e9, 40e9, 101)
    slab = stack(Layer("wires", medium(1.0), 10e-3, wires(2e-3, 50e-6)), frequencies=f, polarizations=("TM",))
    (found,) = find_bands(slab, [40.0], model="local")
    assert len(found.bands) > 3


@pytest.mark.parametrize(
    ("text", "value", "of_peak"),
    [("0.5", 0.5, False), ("-3 dB", 10**-0.3, False), ("-3dB of peak", 10**-0.3, True), ("0.5 of peak", 0.5, True)],
)
def test_levels_are_read_in_power_and_in_decibel(text, value, of_peak):
    level = read_level(text)
    assert level.of_peak == of_peak
    assert level.value == pytest.approx(value, rel=1e-12)


@pytest.mark.parametrize("text", ["", "3 dB", "0", "1.5", "half", "-3 db", "nan", "0.5 peak"])
def test_other_levels_are_refused_with_the_forms_allowed(text):
    with pytest.raises(InputError, match="it must lie between 0 and 1"):
        read_level(text)


def test_minus_three_decibel_is_not_half_power():
    assert read_level("-3 dB").value == pytest.approx(0.5011872336, abs=1e-10)
    assert mp.nstr(10 * mp.log10(0.5), 8) == "-3.0103"
