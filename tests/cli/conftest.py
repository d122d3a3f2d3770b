"""A small stack, a map of it, and the command line run inside the test's process and an empty folder."""

import sys
from pathlib import Path
from typing import NamedTuple

import pytest

from slabsim.cli import main

STACK = """\
[material.foam]
permittivity = 1.07
loss_tangent = 1e-3
[material.copper]
conductivity = "5.8e7 S/m"
[[layer]]
name = "slab"
material = "foam"
thickness = "4 mm"
[[layer.wires]]
pitch = "2 mm"
radius = "50 um"
metal = "copper"
[sweep]
"""
SWEEP = """\
spectrum = { from = "20 GHz", to = "60 GHz", points = 41 }
angle = { from = "0 deg", to = "60 deg", points = 4 }
"""
LONG_SWEEP = """\
spectrum = { from = "20 GHz", to = "60 GHz", points = 400 }
angle = { from = "0 deg", to = "60 deg", points = 300 }
store = ["power"]
"""  # four blocks


class Ended(NamedTuple):
    """How a command ended, and what it wrote."""

    code: int
    out: str
    err: str


@pytest.fixture
def folder(tmp_path, monkeypatch):
    """An empty folder, the current one."""
    monkeypatch.chdir(tmp_path)
    return tmp_path


@pytest.fixture
def slabsim(folder, monkeypatch, capsys):
    """Run `slabsim ARGUMENTS`."""

    def run(*arguments):
        monkeypatch.setattr(sys, "argv", ["slabsim", *(str(argument) for argument in arguments)])
        capsys.readouterr()
        code = 0
        try:
            main()
        except SystemExit as end:
            code = end.code or 0
        return Ended(code, *capsys.readouterr())

    return run


@pytest.fixture
def stack(folder):
    """The small stack as a file."""
    path = Path("slab.toml")
    path.write_text(STACK + SWEEP)
    return path


@pytest.fixture
def map_file(slabsim, stack):
    """Its map."""
    assert slabsim("sweep", stack).code == 0
    return Path("slab.h5")
