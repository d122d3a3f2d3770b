"""Wrong input: one clear message, the right exit code, no traceback, and the files as they were."""

import os
import shutil
import subprocess
import sys
from pathlib import Path

import h5py
import pytest

from tests.cli.conftest import STACK, SWEEP, Ended

JOINED = """\
[[layer]]
name = "behind"
material = "foam"
thickness = "4 mm"
[[layer.wires]]
pitch = "2 mm"
radius = "50 um"
metal = "copper"
"""
FOAM = "permittivity = 1.07\nloss_tangent = 1e-3\n"
STACK_FAULTS = {
    "not TOML": ("thickness =", "thickness = =", "not valid TOML"),
    "misspelt key": ("thickness", "thicknes", 'thicknes: unknown key; did you mean "thickness"'),
    "wrong unit": ('"4 mm"', '"4 GHz"', 'thickness: "4 GHz": "GHz" is a unit of frequency; a length is wanted'),
    "no unit": ('"4 mm"', "4", "thickness: 4 has no unit; a length is written as text with its unit"),
    "negative length": ('"4 mm"', '"-4 mm"', 'thickness: "-4 mm": a length must be greater than zero'),
    "zero length": ('"4 mm"', '"0 mm"', 'thickness: "0 mm": a length must be greater than zero'),
    "touching wires": ('"50 um"', '"1 mm"', "neighbouring wires touch; the radius must be less than 1 mm"),
    "no such material": ('material = "foam"', 'material = "fom"', 'material "fom" is not defined; did you mean "foam"'),
    "lossy front": ("[material.foam]", 'front = "copper"\n[material.foam]', 'front: "copper" is lossy'),
    "grazing angle": ('"60 deg"', '"90 deg"', "an angle of incidence must satisfy 0 deg <= angle < 90 deg"),
    "no points": ("points = 41", "points = 0", "spectrum.points: 0; it must be at least 1"),
    "end not joined": (
        "[sweep]",
        'ends = ["open", "joined"]\n' + JOINED + "[sweep]",
        'ends 2: "joined", but the end of the next layer\'s wires that faces it is "open"',
    ),
    "another cell": (
        "[sweep]",
        'ends = ["open", "joined"]\n' + JOINED.replace("2 mm", "3 mm") + 'ends = ["joined", "open"]\n[sweep]',
        "joined to wires of another cell: 2 mm by 2 mm here, 3 mm by 3 mm there",
    ),
}


def failed(ended, code, *texts):
    """Whether a command failed cleanly: with a message that holds the texts and nothing else."""
    assert ended.code == code
    shown = " ".join(ended.err.replace("│", " ").split())
    for text in texts:
        assert text in shown
    assert "Traceback" not in shown
    return True


@pytest.mark.parametrize("fault", STACK_FAULTS)
def test_faulty_stack_names_the_place_and_leaves_the_map(slabsim, map_file, fault):
    before = map_file.read_bytes()
    old, new, message = STACK_FAULTS[fault]
    Path("bad.toml").write_text((STACK + SWEEP).replace(old, new, 1))
    for command in (["sweep", "bad.toml", "-o", map_file, "--replace"], ["describe", "bad.toml"]):
        ended = slabsim(*command)
        assert failed(ended, 1, message)
        assert ended.err.startswith("bad.toml: ")
        assert ended.out == ""
    assert map_file.read_bytes() == before


def test_several_faults_are_counted(slabsim, folder):
    Path("bad.toml").write_text((STACK + SWEEP).replace('"4 mm"', '"4 s"').replace('"50 um"', "50"))
    ended = slabsim("sweep", "bad.toml")
    assert failed(ended, 1, "2 faults; nothing was computed")
    assert len(ended.err.splitlines()) == 3


def test_frequency_outside_a_table_is_refused(slabsim, folder):
    Path("polymer.csv").write_text("frequency (GHz),eps_re,eps_im\n20,2.2,0.01\n50,2.2,0.01\n")
    Path("bad.toml").write_text((STACK + SWEEP).replace(FOAM, 'table = "polymer.csv"\n'))
    message = 'material "foam" is not known at 51 GHz; its data reach from 20 GHz to 50 GHz and are not extrapolated'
    assert failed(slabsim("sweep", "bad.toml"), 1, message)
    assert not Path("bad.h5").exists()


@pytest.mark.parametrize("command", ["sweep", "passbands", "compare", "describe", "plot"])
def test_missing_file_folder_and_no_argument(slabsim, folder, command):
    Path("folder.toml").mkdir()
    assert failed(slabsim(command, "none.toml"), 1, "none.toml", "there is no")
    assert failed(slabsim(command, "folder.toml"), 1, "folder.toml", "is a folder")
    assert failed(slabsim(command), 2, "Missing argument")


@pytest.mark.parametrize("command", ["passbands", "compare", "describe", "plot"])
def test_map_that_is_none_or_of_another_format(slabsim, map_file, command):
    Path("cut.h5").write_bytes(map_file.read_bytes()[:5000])
    assert failed(slabsim(command, "cut.h5"), 1, "cut.h5: the file is cut short")
    shutil.copy(map_file, "other.h5")
    with h5py.File("other.h5", "r+") as file:
        file.attrs["slabsim_format"] = "9.0"
    assert failed(slabsim(command, "other.h5"), 1, "format 9.0, this program reads format 1.0; use the version")
    h5py.File("foreign.h5", "w").close()
    assert failed(slabsim(command, "foreign.h5"), 1, "this HDF5 file is no slabsim map")
    Path("text.h5").write_text("no map")
    assert failed(slabsim(command, "text.h5"), 1, "this is no HDF5 file, so no slabsim map")


def test_map_and_stack_are_not_mixed_up(slabsim, map_file):
    assert failed(slabsim("sweep", map_file), 1, "slab.h5: this is a map; sweep takes the stack file (TOML)")
    assert failed(slabsim("plot", "slab.toml"), 1, "slab.toml: this is no HDF5 file, so no slabsim map")


def test_existing_map_is_kept_unless_replaced(slabsim, map_file):
    before = map_file.read_bytes()
    command = "go on with an unfinished map: slabsim sweep slab.toml --output slab.h5 --resume"
    assert failed(slabsim("sweep", "slab.toml"), 1, "there is a file already", "--replace it", command)
    ended = slabsim("compare", "slab.toml", "-o", map_file)
    assert failed(ended, 1, "slab.h5: there is a file already; choose another path with --output, or --replace it")
    assert failed(slabsim("sweep", "slab.toml", "--resume", "--replace"), 1, "resume and replace are both set")
    assert map_file.read_bytes() == before


def test_no_file_but_a_map_is_replaced(slabsim, stack):
    before = stack.read_bytes()
    assert failed(slabsim("sweep", stack, "-o", stack, "--replace"), 1, "this file is no map, so it is not replaced")
    assert stack.read_bytes() == before


def test_resume_needs_an_unfinished_map_of_the_same_stack(slabsim, map_file):
    assert failed(slabsim("sweep", "slab.toml", "-o", "none.h5", "--resume"), 1, "none.h5: there is no such file")
    done = slabsim("sweep", "slab.toml", "--resume")
    assert done.code == 0
    assert "the map is complete; nothing is left to compute" in done.out
    before = map_file.read_bytes()
    Path("slab.toml").write_text((STACK + SWEEP).replace('"4 mm"', '"5 mm"'))
    ended = slabsim("sweep", "slab.toml", "--resume")
    assert failed(ended, 1, "belongs to another computation", "the map has 'thickness = \"4 mm\"'; now 'thickness")
    assert map_file.read_bytes() == before


@pytest.mark.parametrize("level", ["0", "1", "2", "3 dB", "nan", "abc", "", "0.5 of", "-inf dB"])
def test_bad_level_names_the_four_forms(slabsim, stack, level):
    for command in ("passbands", "compare"):
        ended = slabsim(command, stack, "--level", level)
        assert failed(ended, 1, f'level = "{level}"; it must lie between 0 and 1', '"-3 dB of peak"')
    assert not Path("slab_compare.h5").exists()


@pytest.mark.parametrize("angle", ["90", "nan", "inf", "-5"])
def test_bad_angle_names_the_range_and_touches_no_file(slabsim, map_file, angle):
    before = map_file.read_bytes()
    for command in (["passbands", map_file], ["compare", "slab.toml", "-o", map_file, "--replace"]):
        assert failed(slabsim(*command, "--angle", angle), 1, "every angle must satisfy 0 <= angle < 90")
    assert failed(slabsim("plot", map_file, "--angle", angle), 1, "deg; the map has 0 to 60 deg")
    assert map_file.read_bytes() == before
    assert not Path("slab.png").exists()


@pytest.mark.parametrize("command", ["passbands", "compare", "plot"])
def test_angle_that_is_no_number_is_wrong_usage(slabsim, map_file, command):
    assert failed(slabsim(command, map_file, "--angle", "abc"), 2, "'--angle'", "valid number")


@pytest.mark.parametrize("tolerance", ["0", "1", "nan", "-0.1"])
def test_bad_tolerance_leaves_the_map(slabsim, map_file, tolerance):
    before = map_file.read_bytes()
    ended = slabsim("compare", "slab.toml", "-o", map_file, "--replace", "--tolerance", tolerance)
    assert failed(ended, 1, "it must lie between 0 and 1")
    assert map_file.read_bytes() == before


def test_choice_that_is_none_names_the_choices(slabsim, map_file):
    for command in ("passbands", "plot"):
        ended = slabsim(command, map_file, "--quantity", "Transmission")
        assert failed(ended, 2, "'Transmission'; it must be one of T, R, A")
    assert failed(slabsim("passbands", map_file, "--model", "exact"), 2, "must be one of nonlocal, local")


def test_nothing_is_transmitted_into_metal(slabsim, folder):
    Path("metal.toml").write_text('back = "perfect conductor"\n' + STACK + SWEEP)
    assert slabsim("sweep", "metal.toml").code == 0
    for command in ("passbands", "plot"):
        ended = slabsim(command, "metal.h5", "--quantity", "T")
        assert failed(ended, 1, "nothing is transmitted into a perfect conductor; ask for R or A")


def test_map_of_amplitudes_alone_cannot_be_plotted(slabsim, folder):
    Path("r.toml").write_text(STACK + SWEEP + 'store = ["amplitude"]\n')
    assert slabsim("sweep", "r.toml").code == 0
    ended = slabsim("plot", "r.h5")
    assert failed(ended, 1, 'r.h5: the map keeps amplitudes only; sweep again with store = ["power", "amplitude"]')


def test_single_frequency_has_no_pass_band(slabsim, folder):
    Path("one.toml").write_text(STACK + 'spectrum = "30 GHz"\nangle = "30 deg"\n')
    assert failed(slabsim("passbands", "one.toml"), 1, "the sweep has one frequency; a pass band needs a range")


def test_outputs_that_cannot_be_made(slabsim, map_file):
    assert failed(slabsim("sweep", "slab.toml", "-o", "none/x.h5"), 1, "does not exist; make it first")
    assert failed(slabsim("compare", "slab.toml", "-o", "none/x.h5"), 1, "does not exist; make it first")
    for name, message in (("x.bmp", "must end in .png, .svg, .pdf"), ("none/x.png", "choose another folder")):
        assert failed(slabsim("plot", map_file, "-o", name), 1, name, message)
        assert failed(slabsim("compare", "slab.toml", "--figure", name, "--replace"), 1, name, message)
    assert failed(slabsim("schema", "-o", "none/x.json"), 1, "none/x.json: cannot be written")
    ended = slabsim("passbands", map_file, "--csv", "none/x.csv")
    assert failed(ended, 1, "none/x.csv: cannot be written (No such file or directory); choose another place")
    assert "Bands where" in ended.out


def test_figure_with_an_unknown_suffix_is_refused_before_the_map_is_made(slabsim, stack):
    assert failed(slabsim("compare", stack, "--figure", "x.bmp"), 1, "must end in")
    assert not Path("slab_compare.h5").exists()


def test_folder_that_is_closed_is_said(map_file):
    lowered = []
    if os.geteuid() == 0:  # nothing is closed to root, unless it gives that power away
        if not shutil.which("setpriv"):
            pytest.skip("run as root, without the program setpriv")
        lowered = ["setpriv", "--bounding-set=-dac_override", "--inh-caps=-dac_override"]
    Path("closed").mkdir()
    old = Path(shutil.copy(map_file, "closed"))
    Path("closed").chmod(0o555)
    for arguments in (["-o", "closed/new.h5"], ["-o", old, "--replace"]):
        command = [*lowered, sys.executable, "-m", "slabsim", "sweep", "slab.toml", *arguments]
        done = subprocess.run(command, capture_output=True, text=True, check=False)
        assert failed(Ended(done.returncode, done.stdout, done.stderr), 1, "may not be created", "another folder")
    Path("closed").chmod(0o755)
    assert old.read_bytes() == map_file.read_bytes()
    assert list(Path("closed").iterdir()) == [old]


def test_plot_needs_matplotlib_and_compare_does_without(slabsim, map_file, monkeypatch):
    monkeypatch.setitem(sys.modules, "matplotlib", None)
    assert failed(slabsim("plot", map_file), 1, 'install it with: pip install "slabsim[plot]"')
    ended = slabsim("compare", map_file)
    assert ended.code == 0
    assert "no figure: figures need matplotlib" in ended.out
    assert failed(slabsim("compare", map_file, "--figure", "x.png"), 1, "figures need matplotlib")


def test_closed_pipe_ends_the_command_silently(map_file):
    reader, writer = os.pipe()
    os.close(reader)
    command = [sys.executable, "-m", "slabsim", "passbands", str(map_file)]
    done = subprocess.run(command, stdout=writer, stderr=subprocess.PIPE, text=True, check=False)
    os.close(writer)
    assert done.stderr == ""


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="needs a device that is always full")
def test_full_disk_behind_the_output_is_said(map_file):
    command = [sys.executable, "-m", "slabsim", "describe", str(map_file)]
    with open("/dev/full", "w") as full:
        done = subprocess.run(command, stdout=full, stderr=subprocess.PIPE, text=True, check=False)
    assert done.returncode == 1
    assert done.stderr.startswith("error: the output cannot be written (No space left")
