import re
import struct

import numpy as np
import pytest
from matplotlib.figure import Figure

from slabsim.errors import InputError, SlabsimError
from slabsim.report.figures import map_figure

F = np.linspace(10e9, 40e9, 31)
ANGLES = np.linspace(0.0, 80.0, 9)


def values(f=F, angles=ANGLES):
    """A ridge that moves with angle."""
    return np.exp(-(((f[:, None] - 20e9 - 1e8 * angles) / 5e9) ** 2))


def draw(path, f=F, angles=ANGLES, panels=("TE", "TM"), **options):
    """A figure of the ridge."""
    shown = [(name, values(f, angles)) for name in panels]
    map_figure(path, "ridge", f, angles, shown, options.pop("unit", "GHz"), "transmittance", **options)


@pytest.fixture
def drawn(monkeypatch, tmp_path):
    """Axes of a figure at the moment it is saved."""
    seen = {}
    save = Figure.savefig

    def keep(figure, *arguments, **options):
        seen["axes"] = figure.axes
        return save(figure, *arguments, **options)

    monkeypatch.setattr(Figure, "savefig", keep)

    def run(*arguments, **options):
        draw(tmp_path / "x.png", *arguments, **options)
        return seen["axes"]

    return run


def test_png_has_the_size_of_its_panels(tmp_path):
    draw(tmp_path / "x.png")
    header = (tmp_path / "x.png").read_bytes()[:24]
    assert header[:8] == b"\x89PNG\r\n\x1a\n"
    assert struct.unpack(">II", header[16:24]) == (1680, 1080)  # 11.2 in by 7.2 in, 150 dots an inch
    draw(tmp_path / "y.png", panels=("TM",))
    assert struct.unpack(">II", (tmp_path / "y.png").read_bytes()[16:24]) == (900, 1080)


def test_svg_and_pdf_are_what_they_say(tmp_path):
    draw(tmp_path / "x.svg")
    text = (tmp_path / "x.svg").read_text()
    assert re.search(r'<svg[^>]*width="806\.4pt"', text)  # 11.2 in
    assert text.count("<image") >= 3  # two maps and the scale, not as thousands of rectangles
    draw(tmp_path / "x.pdf")
    assert (tmp_path / "x.pdf").read_bytes().startswith(b"%PDF")


def test_map_ends_where_the_data_end(drawn):
    uneven = np.array([0.0, 10.0, 50.0])
    axis = drawn(angles=uneven)[0]
    assert axis.get_ylim() == (0.0, 50.0)
    assert axis.get_xlim() == pytest.approx((10.0, 40.0))


def test_axis_is_in_the_unit_of_the_sweep(drawn):
    axes = drawn(unit="mm")
    assert axes[2].get_xlabel() == "wavelength (mm)"
    assert axes[2].lines[0].get_xdata()[0] == pytest.approx(29.9792458)  # c / 10 GHz


def test_cuts_are_the_nearest_angles_of_the_grid_once_each(drawn):
    lines = drawn(cut_angles_deg=[31.0, 29.0, 0.0])[2].lines
    assert [line.get_label() for line in lines] == ["0 deg", "30 deg"]
    np.testing.assert_array_equal(lines[1].get_ydata(), values()[:, 3])


def test_cuts_differ_in_grey_too(drawn):
    looks = [
        (line.get_color(), line.get_linestyle(), line._dash_pattern[1] and tuple(line._dash_pattern[1]))
        for line in drawn(cut_angles_deg=list(ANGLES))[2].lines
    ]
    assert len(set(looks)) == len(looks) == 9


@pytest.mark.parametrize("angle", [90.0, -5.0, float("nan"), float("inf")])
def test_cut_outside_the_map_is_refused(tmp_path, angle):
    with pytest.raises(InputError, match="the map has 0 to 80 deg"):
        draw(tmp_path / "x.png", cut_angles_deg=[angle])
    assert not (tmp_path / "x.png").exists()


def test_one_angle_is_one_line_over_frequency(drawn):
    axes = drawn(angles=np.array([30.0]))
    assert len(axes) == 2
    assert axes[1].lines[0].get_label() == "30 deg"


def test_one_frequency_is_one_line_over_angle(drawn):
    axes = drawn(f=np.array([20e9]))
    assert len(axes) == 2
    np.testing.assert_array_equal(axes[0].lines[0].get_xdata(), ANGLES)
    assert axes[0].lines[0].get_label() == "20 GHz"
    assert axes[0].get_xlabel() == "angle of incidence (deg)"


def test_a_single_point_is_a_visible_mark(drawn):
    line = drawn(f=np.array([20e9]), angles=np.array([30.0]))[0].lines[0]
    assert line.get_marker() == "o"


def test_line_at_the_tolerance_is_named(drawn):
    assert drawn(contour=0.25)[0].get_title() == "TE, white line at 0.25"
    assert drawn(contour=7.0)[0].get_title() == "TE"


def test_small_values_fill_the_scale(drawn, monkeypatch):
    monkeypatch.setitem(globals(), "values", lambda f=F, angles=ANGLES: np.full((f.size, angles.size), 0.02))
    assert drawn()[2].get_ylim()[1] == pytest.approx(0.021)


def test_unfinished_map_is_drawn_where_it_is_done(tmp_path):
    part = values()
    part[10:] = np.nan
    map_figure(tmp_path / "x.png", "part", F, ANGLES, [("TM", part)], "GHz", "transmittance")
    assert (tmp_path / "x.png").stat().st_size > 10_000
    with pytest.raises(InputError, match="no finished points to draw yet"):
        map_figure(tmp_path / "y.png", "part", F, ANGLES, [("TM", part * np.nan)], "GHz", "transmittance")


def test_figure_that_cannot_be_written_says_so(tmp_path):
    with pytest.raises(InputError, match=r"x\.bmp: a figure's name must end in \.png, \.svg, \.pdf"):
        draw(tmp_path / "x.bmp")
    with pytest.raises(SlabsimError, match=r"x\.png: the figure cannot be written \(No such file or directory\)"):
        draw(tmp_path / "none" / "x.png")
