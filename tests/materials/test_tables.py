"""Table files: formats, interpolation, refusals."""

import pickle

import numpy as np
import pytest
from numpy.testing import assert_allclose

from slabsim.constants import C0
from slabsim.errors import MaterialError
from slabsim.materials.tables import read_table

INDEX = "wavelength (um),n,k\n1.0,1.5,0.01\n2.0,1.6,0.02\n4.0,1.7,0\n"


def read(text):
    return read_table("polymer", text, "polymer.csv")


def test_an_index_table_gives_the_squared_index_at_its_rows():
    eps = read(INDEX).permittivity(C0 / np.array([1e-6, 2e-6, 4e-6]))
    assert_allclose(eps, [(1.5 + 0.01j) ** 2, (1.6 + 0.02j) ** 2, 1.7**2], rtol=1e-14)


@pytest.mark.parametrize(
    "text",
    [
        "frequency (THz), eps_re, eps_im\n1, 2.25, 0.1\n3, 2.5, 0.2\n",
        "frequency [GHz]\teps_im\teps_re\n3000\t0,2\t2,5\n1000\t0,1\t2,25\n",
        "\ufeff# measured twice\nfrequency (THz); eps_re; eps_im; note\n1; 2,25; 0,1; dry\n\n3; 2,5; 0,2; wet  # end\n",
        '"Frequency (THz)","eps_re","eps_im"\r\n"1","2.25","0.1"\r\n"3","2.5","0.2"\r\n',
        f"frequency (rad/s),eps_re,eps_im\n{2e12 * np.pi!r},2.25,0.1\n{6e12 * np.pi!r},2.5,0.2\n",
        f"wavenumber (1/cm),eps_re,eps_im\n{1e10 / C0!r},2.25,0.1\n{3e10 / C0!r},2.5,0.2\n",
        "energy (eV),eps_re,eps_im\n0.004135667696923859,2.25,0.1\n0.012407003090771577,2.5,0.2\n",
        f"wavelength (µm),eps_re,eps_im\n{C0 * 1e-6!r},2.25,0.1\n{C0 * 1e-6 / 3!r},2.5,0.2\n",
    ],
)
def test_the_same_table_in_every_form(text):
    frequencies = np.array([1e12, 2e12, 3e12])
    # two rows: the cubic pieces are a straight line
    assert_allclose(read(text).permittivity(frequencies), [2.25 + 0.1j, 2.375 + 0.15j, 2.5 + 0.2j], rtol=1e-12)


def test_between_the_rows_the_data_are_never_overshot():
    rows = "".join(f"{f},{2 + (f > 5)},{0.5 * (f == 5)}\n" for f in range(1, 10))
    table = read("frequency (GHz),eps_re,eps_im\n" + rows)
    eps = table.permittivity(np.linspace(1e9, 9e9, 1001))
    assert eps.real.min() == 2.0
    assert eps.real.max() == 3.0
    assert eps.imag.min() == 0.0


def test_beyond_the_rows_nothing_is_known():
    with pytest.raises(MaterialError, match=r'"polymer" is not known at 5 um; its data reach from 1 um to 4 um'):
        read(INDEX).permittivity(C0 / 5e-6)


def test_a_table_survives_the_way_to_another_process():
    table = read(INDEX)
    frequency = C0 / 1.3e-6
    table.permittivity(frequency)
    assert pickle.loads(pickle.dumps(table)).permittivity(frequency) == table.permittivity(frequency)


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("", "polymer.csv is empty; the header must read like"),
        (
            "# wavelength (um),n,k\n1,1.5,0\n2,1.5,0\n",
            'polymer.csv, line 2: "1,1.5,0" does not name its columns.*without a #',
        ),
        ("wavelength (um),n\n1,1.5\n", "does not name its columns; the header must read like"),
        ("wavelength,n,k\n1,1.5,0\n", 'line 1: the column "wavelength" names no unit'),
        ("wavelength (ym),n,k\n1,1.5,0\n", 'line 1: the column "wavelength": unknown unit "ym".*did you mean'),
        ("wavelength (THz),n,k\n1,1.5,0\n", 'the column "wavelength" is in THz, a unit of frequency'),
        ("wavelength (um),n,k\n", "polymer.csv has 0 data rows; at least 2"),
        ("wavelength (um),n,k\n1,1.5,0\n", "polymer.csv has 1 data rows?; at least 2"),
        ("wavelength (um),n,k\n1,1.5,0\n2,x,0\n", 'polymer.csv, line 3: "x" is no number'),
        ("wavelength (um),n,k\n1,1.5,0\n2,nan,0\n", 'polymer.csv, line 3: "nan" is not finite'),
        ("wavelength (um),n,k\n1,1.5,0\n0,1.5,0\n", "line 3: the spectral value 0 um must be positive"),
        ("wavelength (um),n,k\n1,1,5,0\n", "line 2: 4 cells, but the header names 3; a decimal comma needs another"),
        ("wavelength (um);n;k\n1;1,5\n", "line 2: 2 cells, but the header names 3$"),
        ("wavelength (um),n,k\n1,1.5,0\n2,1.5,0\n1.0,1.6,0\n", "lines 2 and 4: the same spectral point twice"),
        (
            "wavelength (um),n,k\n1,1.5,0\n2,1.5,-0.1\n",
            r"line 3: n = 1.5, k = -0.1: Im\(eps\) = -0.3 would amplify; with the time factor exp\(-i w t\) "
            r"a passive medium has Im\(eps\) >= 0.*k >= 0; data for exp\(\+i w t\) must be conjugated",
        ),
        ("frequency (THz),eps_re,eps_im\n1,2,-0.5\n", r"line 2: Im\(eps\) = -0.5 would amplify"),
    ],
)
def test_a_wrong_table_is_refused_with_its_line(text, message):
    with pytest.raises(MaterialError, match=message):
        read(text)
