"""Maps and their cuts as figures; nothing is computed here.

Maps use one perceptually even colour scale that also reads in grey and to colour-blind eyes; cuts differ in dash and
grey value.
"""

from __future__ import annotations

import os
from collections.abc import Sequence
from pathlib import Path
from typing import Any

import numpy as np

from slabsim.errors import InputError, SlabsimError
from slabsim.units import from_hz

Panels = Sequence[tuple[str, np.ndarray]]
SUFFIXES = (".png", ".svg", ".pdf")
_SCALE = "cividis"
_DASHES = ("solid", (0, (6, 2)), (0, (2, 1.5)), (0, (6, 2, 1.5, 2)), (0, (1, 1)), (0, (9, 3)))
_GREYS = ("0.0", "0.15", "0.3", "0.4", "0.5")  # one fewer than dashes: 30 pairs


def map_figure(
    path: str | os.PathLike[str],
    title: str,
    frequencies: np.ndarray,
    angles_deg: np.ndarray,
    panels: Panels,
    unit: str,
    label: str,
    cut_angles_deg: Sequence[float] | None = None,
    contour: float | None = None,
    angle_axis: str = "angle of incidence (deg)",
) -> None:
    """Draw heat maps over frequency and angle, one per panel, with line cuts below.

    A single angle gives one line over frequency and no map, a single frequency one line over angle.

    Parameters
    ----------
    path : path
        Written; the suffix chooses PNG, SVG or PDF.
    title : str
    frequencies : float array, shape (n_freqs,)
        [Hz]
    angles_deg : float array, shape (n_angles,)
        [degrees]
    panels : sequence of (str, float array of shape (n_freqs, n_angles))
        Name, such as the polarization, and values.
    unit : str
        Spectral unit of the axis.
    label : str
        Name of the values.
    cut_angles_deg : sequence of float, optional
        Angles of the cuts [degrees], the nearest of the grid are taken; default: up to five, evenly spread.
    contour : float, optional
        Value to draw a line at in the maps.
    angle_axis : str
        Name of the axis of angles.

    Raises
    ------
    InputError
        If the suffix is none of .png, .svg, .pdf, the values are all NaN, or a cut lies outside the angles.
    SlabsimError
        If matplotlib is missing or the file cannot be written.
    """
    path = Path(path)
    check_suffix(path)
    if not any(np.any(np.isfinite(values)) for _, values in panels):
        raise InputError(f"{title}: no finished points to draw yet")
    indices = _cut_indices(angles_deg, cut_angles_deg)
    plt = _pyplot()
    x = from_hz(frequencies, unit)
    has_map = angles_deg.size > 1 and frequencies.size > 1
    figure, axes = plt.subplots(
        2 if has_map else 1,
        len(panels),
        figsize=(5.2 * len(panels) + 0.8, 7.2 if has_map else 4.2),
        squeeze=False,
        sharex=True,
        constrained_layout=True,
    )
    figure.suptitle(title)
    if has_map:
        _draw_maps(figure, axes[0], x, angles_deg, panels, label, contour)
        axes[0][0].set_ylabel(angle_axis)
    top = _top(panels)
    for axis, (name, values) in zip(axes[-1], panels, strict=True):
        if frequencies.size > 1:
            _draw_cuts(axis, x, angles_deg, values, indices)
            axis.set_xlabel(f"{_axis_name(unit)} ({unit})")
        else:
            axis.plot(angles_deg, values[0], "-o", color="0.0", markersize=3.0, label=f"{x[0]:g} {unit}")
            axis.set_xlabel(angle_axis)
        axis.legend(fontsize="small", handlelength=3.2)
        axis.set(title="" if has_map else name, ylim=(-0.02 * top, 1.05 * top))
        axis.grid(alpha=0.3)
    axes[-1][0].set_ylabel(label)
    _save(plt, figure, path)


def check_suffix(path: Path) -> None:
    """Raise `InputError` unless the name is one of a figure."""
    if path.suffix.lower() not in SUFFIXES:
        raise InputError(f"{path}: a figure's name must end in {', '.join(SUFFIXES)}")


def _save(plt: Any, figure: Any, path: Path) -> None:
    try:
        figure.savefig(path, dpi=150)
    except OSError as error:
        raise SlabsimError(f"{path}: the figure cannot be written ({error.strerror}); choose another folder") from error
    finally:
        plt.close(figure)


def _pyplot() -> Any:
    try:
        import matplotlib
    except ImportError as error:
        raise SlabsimError('figures need matplotlib; install it with: pip install "slabsim[plot]"') from error
    matplotlib.use("Agg")
    import matplotlib.pyplot as plt

    plt.rcParams["svg.hashsalt"] = "slabsim"
    return plt


def _draw_maps(
    figure: Any, axes: Any, x: np.ndarray, angles_deg: np.ndarray, panels: Panels, label: str, contour: float | None
) -> None:
    top = _top(panels)
    for axis, (name, values) in zip(axes, panels, strict=True):
        image = axis.pcolormesh(
            x, angles_deg, values.T, cmap=_SCALE, vmin=0.0, vmax=top, shading="nearest", rasterized=True
        )
        # cells at the border reach beyond the data, below 0 deg for one
        axis.set(title=name, xlim=(x.min(), x.max()), ylim=(angles_deg[0], angles_deg[-1]))
        if contour is not None and np.nanmin(values) < contour < np.nanmax(values):
            axis.contour(x, angles_deg, values.T, levels=[contour], colors="white", linewidths=1.0)
            axis.set_title(f"{name}, white line at {contour:g}")
    figure.colorbar(image, ax=list(axes), label=label)


def _draw_cuts(axis: Any, x: np.ndarray, angles_deg: np.ndarray, values: np.ndarray, indices: list[int]) -> None:
    for number, index in enumerate(indices):
        dash, grey = _DASHES[number % len(_DASHES)], _GREYS[number % len(_GREYS)]
        axis.plot(x, values[:, index], linestyle=dash, color=grey, linewidth=1.3, label=f"{angles_deg[index]:g} deg")


def _cut_indices(angles_deg: np.ndarray, wanted: Sequence[float] | None) -> list[int]:
    if wanted is None:
        count = min(5, angles_deg.size)
        return sorted({round(i * (angles_deg.size - 1) / max(count - 1, 1)) for i in range(count)})
    low, high = angles_deg[0], angles_deg[-1]
    for angle in wanted:
        if not low <= angle <= high:  # written so that NaN fails too
            raise InputError(f"angle = {angle:g} deg; the map has {low:g} to {high:g} deg: choose an angle among these")
    return sorted({int(np.argmin(abs(angles_deg - angle))) for angle in wanted})


def _top(panels: Panels) -> float:
    top = max(float(np.nanmax(values)) for _, values in panels if np.any(np.isfinite(values)))
    return 1.0 if top > 0.5 else max(top, 1e-12)


def _axis_name(unit: str) -> str:
    from slabsim.units import spectral_kind

    return spectral_kind(unit)
