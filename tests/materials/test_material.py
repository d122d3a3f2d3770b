"""Materials: ranges, shapes, magnetism."""

import pickle

import numpy as np
import pytest

from slabsim.constants import C0
from slabsim.errors import MaterialError
from slabsim.materials.dispersion import Constant, ResonantPermeability
from slabsim.materials.material import VACUUM, Material

SILICA = Material("silica", Constant(2.1), None, (C0 / 3.71e-6, C0 / 0.21e-6), "um")


def test_a_frequency_outside_the_range_is_named_in_the_unit_of_the_data():
    message = 'material "silica" is not known at 5 um; its data reach from 0.21 um to 3.71 um'
    with pytest.raises(MaterialError, match=message):
        SILICA.permittivity(np.array([C0 / 1e-6, C0 / 5e-6]))


def test_permeability_is_refused_outside_the_range_too():
    with pytest.raises(MaterialError, match=r"not known at 0\.1 um"):
        SILICA.permeability(C0 / 0.1e-6)


def test_the_ends_of_a_range_belong_to_it_whatever_the_rounding():
    ends = np.array([C0 / 3.71e-6, C0 / 0.21e-6])
    assert np.all(SILICA.permittivity(ends * (1 + 1e-15)) == 2.1)
    assert np.all(SILICA.permittivity(ends * (1 - 1e-15)) == 2.1)


def test_results_are_complex_and_shaped_like_the_frequencies():
    frequency = np.ones((2, 3)) * 1e9
    for values in (VACUUM.permittivity(frequency), VACUUM.permeability(frequency)):
        assert values.shape == (2, 3)
        assert values.dtype == complex
        assert np.all(values == 1.0)
    assert VACUUM.permittivity(1e9).shape == ()


def test_only_a_permeability_makes_a_material_magnetic():
    rings = Material("rings", Constant(2.2), ResonantPermeability(10e9, 0.3, 0.1e9))
    assert rings.is_magnetic
    assert not VACUUM.is_magnetic
    assert rings.permeability(9e9).real > 1.0


def test_a_material_survives_the_way_to_another_process():
    assert pickle.loads(pickle.dumps(SILICA)) == SILICA
