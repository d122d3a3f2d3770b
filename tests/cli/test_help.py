"""What a new user sees first, and how fast."""

import re
import subprocess
import sys

COMMANDS = ["sweep", "passbands", "compare", "losses", "describe", "plot", "schema"]


def test_help_lists_the_commands(slabsim):
    ended = slabsim("--help")
    assert ended.code == 0
    listed = ended.out[ended.out.index("Commands") :]
    assert re.findall(r"^\W*([a-z]+)  ", listed, flags=re.MULTILINE) == COMMANDS


def test_every_command_has_help(slabsim):
    for command in COMMANDS:
        ended = slabsim(command, "-h")
        assert ended.code == 0
        assert f"{command} [OPTIONS]" in ended.out


def test_version_is_that_of_the_package(slabsim):
    from slabsim import __version__

    assert slabsim("--version").out == f"slabsim {__version__}\n"


def test_no_command_and_an_unknown_one_are_wrong_usage(slabsim):
    assert slabsim().code == 2
    ended = slabsim("swep", "x.toml")
    assert ended.code == 2
    assert "No such command 'swep'" in ended.err


def test_help_imports_none_of_the_heavy_packages():
    code = (
        "import sys; sys.argv = ['slabsim', '--help']\n"
        "from slabsim.cli import main\n"
        "try: main()\n"
        "except SystemExit: pass\n"
        "print('loaded', sorted({'numpy', 'scipy', 'numba', 'h5py', 'pydantic', 'matplotlib'} & sys.modules.keys()))"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.rstrip().endswith("loaded []")
    assert "passbands" in done.stdout


def test_the_package_runs_as_a_module():
    done = subprocess.run([sys.executable, "-m", "slabsim", "--version"], capture_output=True, text=True, check=True)
    assert done.stdout.startswith("slabsim ")
