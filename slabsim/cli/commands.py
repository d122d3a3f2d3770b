"""The commands. Each reads its arguments, calls `slabsim.api`, and shows what comes back."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

if TYPE_CHECKING:
    pass

app = typer.Typer(
    name="slabsim",
    help="Reflection, transmission and absorption of slabs of thin parallel wires.",
    epilog="Not a safety rating: for protection rely on standards, certified measurements and licensed practice.",
    add_completion=False,
    no_args_is_help=True,
    pretty_exceptions_enable=False,
    rich_markup_mode=None,
    context_settings={"help_option_names": ["-h", "--help"]},
)

StackFile = Annotated[Path, typer.Argument(metavar="STACK", help="Stack file (TOML).")]
Source = Annotated[Path, typer.Argument(metavar="SOURCE", help="Stack file (TOML) or map (HDF5).")]
LevelText = Annotated[
    str, typer.Option("--level", help='Band level: "0.5", "-3 dB", "0.5 of peak" or "-3 dB of peak".')
]
Angles = Annotated[
    list[float] | None, typer.Option("--angle", help="Angle in degrees; may be given again. Default: up to ten.")
]
Azimuth = Annotated[
    float | None, typer.Option("--azimuth", help="Azimuth in degrees. Default: the first of the sweep.")
]
Replace = Annotated[bool, typer.Option("--replace", help="Replace an existing map.")]
_MOST_ANGLES = 10


def _version(wanted: bool) -> None:
    if wanted:
        from slabsim import __version__

        typer.echo(f"slabsim {__version__}")
        raise typer.Exit


@app.callback()
def _options(
    version: Annotated[
        bool, typer.Option("--version", callback=_version, is_eager=True, help="Print the version.")
    ] = False,
) -> None:
    """Reflection, transmission and absorption of slabs of thin parallel wires."""


@app.command()
def sweep(
    stack: StackFile,
    output: Annotated[
        Path | None, typer.Option("--output", "-o", help="Map to write. Default: STACK's name.h5.")
    ] = None,
    resume: Annotated[bool, typer.Option("--resume", help="Go on with an unfinished map.")] = False,
    replace: Replace = False,
    compress: Annotated[bool, typer.Option("--compress", help="Smaller and much slower.")] = False,
) -> None:
    """Compute the sweep of a stack into a map file."""
    from time import perf_counter

    from slabsim.cli.progress import announce_compilation, bar
    from slabsim.errors import MapError, SweepInterrupted
    from slabsim.stack.reader import read_stack
    from slabsim.sweeps.run import run_sweep

    _check_no_map(stack)
    sample = read_stack(stack)
    target = output or Path(stack.stem + ".h5")
    announce_compilation(sample)
    start = perf_counter()
    try:
        report = run_sweep(sample, target, resume=resume, replace=replace, compress=compress, progress=bar())
    except (MapError, SweepInterrupted) as stop:
        raise type(stop)(_with_stack(str(stop), stack, target)) from stop
    typer.echo(_with_stack(str(report), stack, target))
    if report.n_computed:
        channels = _count(len(sample.sweep.polarizations), "polarization")
        if sample.mixes_polarizations:
            channels += " and their cross terms"
        points = f"{_count(report.n_points, 'point')} by {channels}"
        typer.echo(f"{points}, {sample.sweep.model} model, {perf_counter() - start:.1f} s")
    if not report.is_complete:
        raise typer.Exit(1)


@app.command()
def passbands(
    source: Source,
    level: LevelText = "0.5 of peak",
    quantity: Annotated[str | None, typer.Option(help="T, R or A. Default: T, or A on a metal back.")] = None,
    angle: Angles = None,
    azimuth: Annotated[
        list[float] | None,
        typer.Option("--azimuth", help="Azimuth in degrees; may be given again. Default: up to four."),
    ] = None,
    cross: Annotated[bool, typer.Option("--cross", help="Also the bands of the other polarization.")] = False,
    model: Annotated[str | None, typer.Option(help="nonlocal or local. Default: that of the source.")] = None,
    csv: Annotated[Path | None, typer.Option(help="Also write the bands to this file, in SI units.")] = None,
) -> None:
    """Print the pass bands per polarization, azimuth and angle.

    Every band where the power exceeds a level, and how its edges shift with angle.
    """
    from slabsim import api
    from slabsim.cli.progress import announce_compilation
    from slabsim.report import tables

    sample = api.load_stack(source)
    announce_compilation(sample)
    chosen, turns = angle or _some(sample.sweep.angles_deg), azimuth or _some(sample.sweep.azimuths_deg, 4)
    lists = api.find_bands(
        sample,
        sorted(set(chosen)),
        api.read_level(level),
        _quantity(quantity),
        _model(model),
        azimuths_deg=sorted(set(turns)),
        cross=cross,
    )
    unit = sample.sweep.spectral_unit
    typer.echo(f"{sample.title or sample.file_name}: {model or sample.sweep.model} model, level {level}")
    tables.show(tables.band_table(lists, unit))
    groups: dict[str, list[Any]] = {}
    for found in lists:
        words = found.polarization.replace("_", " ")
        if len({one.azimuth_deg for one in lists}) > 1:
            words += f", azimuth {found.azimuth_deg:g} deg"
        groups.setdefault(words, []).append(found)
    tracks = [
        (words, track) for words, group in groups.items() for track in api.follow_bands(group) if len(track.bands) > 1
    ]
    if tracks:
        tables.show(tables.shift_table(tracks, unit))
    if not angle and len(chosen) < sample.sweep.angles_deg.size:
        typer.echo(f"{len(chosen)} of the {sample.sweep.angles_deg.size} angles of the sweep; others with --angle")
    if not azimuth and sample.depends_on_azimuth and len(turns) < sample.sweep.azimuths_deg.size:
        typer.echo(f"{len(turns)} of the {sample.sweep.azimuths_deg.size} azimuths of the sweep; others with --azimuth")
    if csv:
        _write(csv, tables.bands_as_csv(lists))


@app.command()
def compare(
    source: Source,
    tolerance: Annotated[float, typer.Option(help="Largest difference of power that counts as agreement.")] = 0.01,
    level: LevelText = "0.5 of peak",
    angle: Angles = None,
    azimuth: Azimuth = None,
    output: Annotated[
        Path | None, typer.Option("--output", "-o", help="Map that takes the differences. Default: see below.")
    ] = None,
    figure: Annotated[Path | None, typer.Option(help="Figure of the differences, .png, .svg or .pdf.")] = None,
    replace: Replace = False,
) -> None:
    """Compare the local with the nonlocal model of the wires.

    Says whether the local one can be trusted.

    The differences go into the map if SOURCE is one, else into a new map, NAME_compare.h5; the figure is
    NAME_compare.png unless --figure names it. NAME is that of SOURCE.
    """
    from slabsim import api
    from slabsim.cli.progress import announce_compilation
    from slabsim.report import tables
    from slabsim.report.figures import check_suffix

    sample = api.load_stack(source)
    announce_compilation(sample)
    chosen = sorted(set(angle or _some(sample.sweep.angles_deg)))
    is_in_place = api.is_map(source) and (output is None or output == source)
    target = source if is_in_place else output or Path(source.stem + "_compare.h5")
    if not is_in_place and target.exists() and not replace:
        raise api.InputError(f"{target}: there is a file already; choose another path with --output, or --replace it")
    if figure:
        check_suffix(figure)
    # everything is computed before a map is made or replaced: an error leaves the files as they were
    comparison = api.compare_models(
        sample, tolerance=tolerance, angles_deg=chosen, level=api.read_level(level), azimuth_deg=azimuth
    )
    if not is_in_place:
        api.sweep(sample, target, replace=replace)
    api.store_comparison(comparison, target)
    turn = f", azimuth {comparison.azimuth_deg:g} deg" if sample.depends_on_azimuth else ""
    typer.echo(f"{sample.title or sample.file_name}: level {level}{turn}")
    tables.show(tables.comparison_tables(comparison, sample.sweep.spectral_unit))
    typer.echo(f"differences in {target} (/entry/comparison)")
    drawn = figure or Path(source.stem + "_compare.png")
    try:
        api.draw_comparison(comparison, sample, drawn)
    except api.SlabsimError as error:
        if figure:
            raise
        typer.echo(f"no figure: {error}")
    else:
        typer.echo(f"figure {drawn}")


@app.command()
def losses(
    source: Source,
    frequency: Annotated[str, typer.Option(help='Such as "10 GHz", "300 cm^-1" or "1.2 um".')],
    angle: Annotated[float, typer.Option(help="Angle of incidence in degrees.")] = 0.0,
    azimuth: Azimuth = None,
    model: Annotated[str | None, typer.Option(help="nonlocal or local. Default: that of the source.")] = None,
) -> None:
    """Print where the incident power goes at one point.

    Out in each polarization, and into each layer, sheet and set of wires.
    """
    from slabsim import api
    from slabsim.cli.progress import announce_compilation
    from slabsim.report import stack_tables, tables

    sample = api.load_stack(source)
    f = api.read_frequency(frequency)
    announce_compilation(sample)
    budget = api.power_budget(sample, f, angle, azimuth, _model(model))
    turn = f", azimuth {budget.azimuth_deg:g} deg" if sample.depends_on_azimuth else ""
    where = f"{frequency}, {angle:g} deg{turn}"
    typer.echo(f"{sample.title or sample.file_name}: {where}, {budget.model} model")
    tables.show(stack_tables.loss_table(budget))


@app.command()
def describe(source: Source) -> None:
    """Print what was read, with derived numbers.

    Plasma frequency by every formula, pitch over wavelength, skin depth, wire loss.
    """
    from slabsim import api
    from slabsim.report import stack_tables, tables

    sample = api.load_stack(source)
    tables.show(stack_tables.description_tables(api.describe_stack(sample), sample.sweep.spectral_unit))


@app.command()
def plot(
    map_file: Annotated[Path, typer.Argument(metavar="MAP", help="Map (HDF5).")],
    output: Annotated[
        Path | None, typer.Option("--output", "-o", help="Figure, .png, .svg or .pdf. Default: MAP's name.png.")
    ] = None,
    quantity: Annotated[str | None, typer.Option(help="T, R or A. Default: T, or A on a metal back.")] = None,
    angle: Annotated[
        list[float] | None, typer.Option("--angle", help="Angle of a line cut; may be given again.")
    ] = None,
    azimuth: Azimuth = None,
    over: Annotated[
        str, typer.Option(help="angle, or azimuth: frequency against azimuth, at the one --angle.")
    ] = "angle",
) -> None:
    """Draw a map as heat maps and line cuts.

    The powers that leave in the other polarization are drawn where there are any.
    """
    from slabsim import api

    target = output or Path(map_file.stem + ".png")
    over_azimuth = _choice(over, "--over", ("angle", "azimuth")) == "azimuth"
    if over_azimuth and azimuth is not None:
        raise typer.BadParameter("with --over azimuth all azimuths are drawn", param_hint="--azimuth")
    if over_azimuth and angle and len(angle) > 1:
        raise typer.BadParameter("with --over azimuth there is one angle", param_hint="--angle")
    api.draw_map(map_file, target, _quantity(quantity), angle, azimuth, over_azimuth)
    typer.echo(str(target))


@app.command()
def schema(
    output: Annotated[Path | None, typer.Option("--output", "-o", help="File to write. Default: the terminal.")] = None,
) -> None:
    """Print the JSON schema of the stack file.

    For editors that complete and check.
    """
    import json

    from slabsim.stack.schema import stack_schema

    text = json.dumps(stack_schema(), indent=2)
    if output:
        _write(output, text + "\n")
    else:
        typer.echo(text)


def _some(angles: Any, most: int = _MOST_ANGLES) -> list[float]:
    """Up to `most` of the angles, evenly spread, first and last among them."""
    count = min(most, angles.size)
    return [float(angles[i]) for i in sorted({round(k * (angles.size - 1) / max(count - 1, 1)) for k in range(count)})]


def _check_no_map(path: Path) -> None:
    from slabsim.errors import InputError
    from slabsim.store.failures import has_signature

    if path.is_file() and has_signature(path):
        raise InputError(f"{path}: this is a map; sweep takes the stack file (TOML) that it was computed from")


def _with_stack(message: str, stack: Path, target: Path) -> str:
    """The message with the command to go on as it is to be typed, the stack file named."""
    from shlex import quote

    from slabsim.store.failures import RESUME_CURE

    typed = RESUME_CURE.format(path=quote(str(target))).replace("STACK", quote(str(stack)), 1)
    for path in (target.resolve(), target):
        message = message.replace(RESUME_CURE.format(path=path), typed)
    return message


def _count(number: int, noun: str) -> str:
    return f"{number:,} {noun}" if number == 1 else f"{number:,} {noun}s"


def _quantity(text: str | None) -> Any:
    return _choice(text.upper() if text in ("t", "r", "a") else text, "--quantity", ("T", "R", "A"))


def _model(text: str | None) -> Any:
    return _choice(text, "--model", ("nonlocal", "local"))


def _choice(text: str | None, option: str, allowed: tuple[str, ...]) -> str | None:
    if text is not None and text not in allowed:
        raise typer.BadParameter(f"{text!r}; it must be one of {', '.join(allowed)}", param_hint=option)
    return text


def _write(path: Path, text: str) -> None:
    from slabsim.errors import SlabsimError

    try:
        path.write_text(text, encoding="utf-8")
    except OSError as error:
        raise SlabsimError(f"{path}: cannot be written ({error.strerror}); choose another place") from error
    typer.echo(str(path))
