"""The front door: everything the commands do, from Python.

    from slabsim import api

    stack = api.read_stack("window.toml")
    response = api.solve(stack, [30e9, 35e9], [0.0, 45.0])      # complex r, t and powers R, T, A
    api.sweep(stack, "window.h5")                               # the map
    bands = api.find_bands(stack, angles_deg=[0, 30, 60])       # pass bands
    comparison = api.compare_models(stack)                      # local against nonlocal
    budget = api.power_budget(stack, 30e9, 45.0)                # power lost in each layer and set of wires

Conventions (time factor exp(-i w t), amplitudes, signs) are stated in `slabsim.engine`. Frequencies are in Hz, angles
in degrees.
"""

from __future__ import annotations

import os
from collections.abc import Iterable
from pathlib import Path
from typing import Any

import numpy as np

from slabsim.analyses.comparison import NOTHING, Comparison, compare_models
from slabsim.analyses.description import Description, describe_stack
from slabsim.analyses.losses import PowerBudget, power_budget
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
from slabsim.units import parse

__all__ = [
    "Band",
    "BandList",
    "Comparison",
    "Description",
    "InputError",
    "Level",
    "MapError",
    "MaterialError",
    "PowerBudget",
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
    "power_budget",
    "read_frequency",
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
    azimuth_deg: float = 0.0,
) -> Response:
    """Amplitudes and powers on any grid of frequencies [Hz] and angles [degrees]; see `Solver.solve`."""
    return Solver(stack, model, polarizations).solve(frequencies, angles_deg, azimuth_deg)


def read_frequency(text: str) -> float:
    """Frequency [Hz] of a text such as "10 GHz", "300 cm^-1" or "1.2 um".

    Raises
    ------
    UnitError
        If the text is no positive spectral quantity.
    """
    frequency = parse(text, "spectral")
    if not frequency > 0.0:
        raise UnitError(f'"{text}": a frequency must be greater than zero')
    return frequency


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
    azimuth_deg: float | None = None,
    over_azimuth: bool = False,
) -> None:
    """Draw one quantity of a map as heat maps and line cuts; cross-polar ones where they are not zero.

    Parameters
    ----------
    map_path, figure_path : path
        The map; the figure, .png, .svg or .pdf.
    quantity : {"T", "R", "A"}, optional
        Default: transmittance; absorptance where there is none.
    cut_angles_deg : list of float, optional
        Angles of the cuts [degrees]; with `over_azimuth` the one angle of incidence that is drawn.
    azimuth_deg : float, optional
        Which azimuth of the map [degrees], the nearest one; default: the first.
    over_azimuth : bool
        Draw frequency against azimuth, at one angle of incidence.

    Raises
    ------
    InputError
        If the map does not hold the quantity, or not the azimuth.
    """
    stack = load_stack(map_path)
    with open_map(map_path) as found:
        quantity = quantity or ("T" if "transmittance" in found.quantities else "A")
        name = _DATASETS.get(quantity, quantity)
        if name not in found.quantities:
            raise InputError(f"{map_path}: {_absence(stack, quantity)}")
        state = "" if found.is_complete else " (unfinished)"
        title = f"{found.title or found.file_name}, {found.model} model{state}"
        unit = stack.sweep.spectral_unit
        if over_azimuth:
            column = _nearest(found.angles_deg, (cut_angles_deg or [float(found.angles_deg[0])])[0], "angle")
            title += f", angle {found.angles_deg[column]:g} deg"
            panels = _panels(found, name, range(found.azimuths_deg.size), slice(column, column + 1))
            axis = "azimuth (deg)"
            map_figure(figure_path, title, found.frequencies, found.azimuths_deg, panels, unit, name, angle_axis=axis)
            return
        row = 0 if azimuth_deg is None else _nearest(found.azimuths_deg, azimuth_deg, "azimuth")
        if found.azimuths_deg.size > 1 or found.azimuths_deg[0] != 0.0:
            title += f", azimuth {found.azimuths_deg[row]:g} deg"
        panels = _panels(found, name, [row], slice(None))
        map_figure(figure_path, title, found.frequencies, found.angles_deg, panels, unit, name, cut_angles_deg)


def _panels(found: SweepMap, name: str, azimuths: Iterable[int], angles: slice) -> list[tuple[str, np.ndarray]]:
    """Values of each channel over frequency and angle, or azimuth; cross terms that are zero throughout left out."""
    panels = []
    for channel in found.polarizations if name == "absorptance" else found.channels:
        parts = [found.read(name, channel, azimuth, angles=angles) for azimuth in azimuths]
        values = np.concatenate(parts, axis=1)
        if channel in found.polarizations or np.nanmax(values, initial=0.0) > NOTHING:
            panels.append((channel.replace("_", " "), values))
    return panels


def _nearest(values: np.ndarray, wanted: float, what: str) -> int:
    low, high = float(values[0]), float(values[-1])
    if not low <= wanted <= high:  # written so that NaN fails too
        raise InputError(f"{what} = {wanted:g} deg; the map has {low:g} to {high:g} deg: choose one among these")
    return int(np.argmin(abs(values - wanted)))


def _absence(stack: Stack, quantity: str) -> str:
    if quantity not in _DATASETS:
        return f"quantity {quantity!r}; it must be one of {', '.join(_DATASETS)}"
    if quantity == "T" and stack.back is None:
        return "nothing is transmitted into a perfect conductor; ask for R or A"
    return 'the map keeps amplitudes only; sweep again with store = ["power", "amplitude"]'


def draw_comparison(comparison: Comparison, stack: Stack, figure_path: str | os.PathLike[str]) -> None:
    """Draw the absolute difference of two models, with a line where it equals the tolerance."""
    trusted, other = comparison.models
    panels = [
        (channel.replace("_", " "), abs(values))
        for channel, values in zip(comparison.channels, comparison.difference, strict=True)
        if channel in comparison.verdicts
    ]
    map_figure(
        figure_path,
        f"{stack.title or stack.file_name}: {other} against {trusted} model",
        comparison.frequencies,
        comparison.angles_deg,
        panels,
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
    verdicts = {f"verdict_{channel}": text for channel, text in comparison.verdicts.items()}
    attributes = {
        "tolerance": comparison.tolerance,
        "azimuth": comparison.azimuth_deg,
        "trusted_model": trusted,
        "other_model": other,
    }
    write_comparison(map_path, fields, attributes | verdicts)
