"""The stiffness of a wire mesh against its sum, term by term."""

import numpy as np
import pytest
from scipy.special import j0

from slabsim.errors import InputError
from slabsim.materials.mesh import stiffness


@pytest.mark.parametrize("thin", [1e-3, 0.01, 0.05, 0.2, 0.45])
def test_closed_form_is_the_sum_of_bessel_functions(thin):
    n = np.arange(1, 400_001)
    x = 2 * np.pi * thin
    total = np.sum((j0(n * x) / n) ** 2) + 1 / (2 * np.pi * x * n[-1] ** 2)  # the rest, with the mean of J0^2
    beta2 = 1 / (2 / (2 * np.pi) ** 2 * total)
    assert stiffness(1.0, thin, 2.0) == pytest.approx(3 / (1 + 2 * 4.0 / beta2), rel=1e-11)


def test_thin_wires_have_beta_a_of_root_12():
    # published limit (from memory): 1/beta^2 -> a^2/12
    assert stiffness(1.0, 1e-9, 2.0) == pytest.approx(3 / (1 + 2 * 4 / 12), rel=1e-7)


def test_faint_wires_stand_alone():
    assert stiffness(1.0, 0.01, 1e-6) == pytest.approx(3.0, rel=1e-9)


def test_touching_wires_are_refused():
    with pytest.raises(InputError, match="radius = 1 mm with pitch = 2 mm"):
        stiffness(2e-3, 1e-3, 100.0)
