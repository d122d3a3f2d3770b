"""The front door: everything the commands do, from Python.

    from slabsim import api

    stack = api.read_stack("window.toml")
    response = api.solve(stack, [30e9, 35e9], [0.0, 45.0])      # complex r, t and powers R, T, A
    api.sweep(stack, "window.h5")                               # the map
    bands = api.find_bands(stack, angles_deg=[0, 30, 60])       # pass bands
    comparison = api.compare_models(stack)                      # local against nonlocal
    lost = api.absorbed_by_element(stack, 30e9, 45.0, "TM")     # power lost in each layer

Conventions (time factor exp(-i w t), amplitudes, signs) are stated in `slabsim.engine`. Frequencies are in Hz, angles
in degrees.
"""

from __future__ import annotations

import os
from pathlib import Path
from typing import Any

import numpy as np

from slabsim.analyses.comparison import Comparison, compare_models
from slabsim.analyses.description import Description, describe_stack
from slabsim.analyses.passbands import Band, BandList, Level, find_bands, read_level
from slabsim.analyses.tracking import Track, follow_bands
from slabsim.engine.fields import absorbed_by_element
from slabsim.engine.response import Response, Solver
from slabsim.errors import (
    InputError,
    MapError,
    MaterialError,
    SlabsimError,
    StackError,
    SweepInterrupted,
    UnitError,
)
from slabsim.report.figures import map_figure
from slabsim.stack.reader import parse_stack, read_stack
from slabsim.stack.sample import Model, Polarization, Stack
from slabsim.stack.schema import stack_schema
from slabsim.store.comparison import Field, write_comparison
from slabsim.store.reader import SweepMap, open_map
from slabsim.sweeps.report import SweepReport
from slabsim.sweeps.run import run_sweep

__all__ = [
    "Band",
    "BandList",
    "Comparison",
    "Description",
    "InputError",
    "Level",
    "MapError",
    "MaterialError",
    "Response",
    "SlabsimError",
    "Solver",
    "Stack",
    "StackError",
    "SweepInterrupted",
    "SweepMap",
    "SweepReport",
    "Track",
    "UnitError",
    "absorbed_by_element",
    "compare_models",
    "describe_stack",
    "draw_comparison",
    "draw_map",
    "find_bands",
    "follow_bands",
    "is_map",
    "load_stack",
    "open_map",
    "parse_stack",
    "read_level",
    "read_stack",
    "solve",
    "stack_schema",
    "store_comparison",
    "sweep",
]

_SIGNATURE = b"\x89HDF\r\n\x1a\n"
_DATASETS = {"T": "transmittance", "R": "reflectance", "A": "absorptance"}


def solve(
    stack: Stack,
    frequencies: np.ndarray | float,
    angles_deg: np.ndarray | float,
    model: Model | None = None,
    polarizations: tuple[Polarization, ...] | None = None,
) -> Response:
    """Amplitudes and powers on any grid of frequencies [Hz] and angles [degrees]; see `Solver.solve`."""
    return Solver(stack, model, polarizations).solve(frequencies, angles_deg)


def sweep(stack: Stack, path: str | os.PathLike[str], **options: Any) -> SweepReport:
    """Compute the sweep of a stack into a map; options as in `slabsim.sweeps.run.run_sweep`."""
    return run_sweep(stack, path, **options)


def is_map(path: str | os.PathLike[str]) -> bool:
    """Whether a file is HDF5, by its first bytes."""
    try:
        with open(path, "rb") as file:
            return file.read(len(_SIGNATURE)) == _SIGNATURE
    except OSError:
        return False


def load_stack(path: str | os.PathLike[str]) -> Stack:
    """The stack of a stack file, or the one that a map was computed from.

    Raises
    ------
    StackError, MapError
        If the file cannot be read as what it is.
    """
    if not is_map(path) and Path(path).suffix != ".h5":
        return read_stack(Path(path))
    with open_map(path) as found:
        return parse_stack(found.stack_text, Path(path).parent, found.file_name, found.tables)


def draw_map(
    map_path: str | os.PathLike[str],
    figure_path: str | os.PathLike[str],
    quantity: str | None = None,
    cut_angles_deg: list[float] | None = None,
) -> None:
    """Draw one quantity of a map as heat maps and line cuts.

    Parameters
    ----------
    map_path, figure_path : path
        The map; the figure, .png, .svg or .pdf.
    quantity : {"T", "R", "A"}, optional
        Default: transmittance; absorptance where there is none.
    cut_angles_deg : list of float, optional
        Angles of the cuts [degrees].

    Raises
    ------
    InputError
        If the map does not hold the quantity.
    """
    stack = load_stack(map_path)
    with open_map(map_path) as found:
        quantity = quantity or ("T" if "transmittance" in found.quantities else "A")
        name = _DATASETS.get(quantity, quantity)
        if name not in found.quantities:
            raise InputError(f"{map_path}: {_absence(stack, quantity)}")
        panels = [(polarization, found.read(name, polarization)) for polarization in found.polarizations]
        state = "" if found.is_complete else " (unfinished)"
        title = f"{found.title or found.file_name}, {found.model} model{state}"
        unit = stack.sweep.spectral_unit
        map_figure(figure_path, title, found.frequencies, found.angles_deg, panels, unit, name, cut_angles_deg)


def _absence(stack: Stack, quantity: str) -> str:
    if quantity not in _DATASETS:
        return f"quantity {quantity!r}; it must be one of {', '.join(_DATASETS)}"
    if quantity == "T" and stack.back is None:
        return "nothing is transmitted into a perfect conductor; ask for R or A"
    return 'the map keeps amplitudes only; sweep again with store = ["power", "amplitude"]'


def draw_comparison(comparison: Comparison, stack: Stack, figure_path: str | os.PathLike[str]) -> None:
    """Draw the absolute difference of two models, with a line where it equals the tolerance."""
    trusted, other = comparison.models
    map_figure(
        figure_path,
        f"{stack.title or stack.file_name}: {other} against {trusted} model",
        comparison.frequencies,
        comparison.angles_deg,
        list(zip(comparison.polarizations, abs(comparison.difference), strict=True)),
        stack.sweep.spectral_unit,
        f"difference of {_DATASETS[comparison.quantity]}",
        contour=comparison.tolerance,
    )


def store_comparison(comparison: Comparison, map_path: str | os.PathLike[str]) -> None:
    """Store both models' powers and their difference in a map, group /entry/comparison."""
    name, (trusted, other) = _DATASETS[comparison.quantity], comparison.models
    fields = {
        "difference": Field(comparison.difference, f"{name}, {other} minus {trusted} model"),
        f"{name}_{trusted}": Field(comparison.powers[0], f"{name}, {trusted} model"),
        f"{name}_{other}": Field(comparison.powers[1], f"{name}, {other} model"),
    }
    verdicts = {f"verdict_{polarization}": text for polarization, text in comparison.verdicts.items()}
    attributes = {"tolerance": comparison.tolerance, "trusted_model": trusted, "other_model": other}
    write_comparison(map_path, fields, attributes | verdicts)
