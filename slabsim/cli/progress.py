"""A progress bar with rate and time left; silent when the output is piped."""

from __future__ import annotations

from typing import TYPE_CHECKING

from slabsim.sweeps.progress import Progress, SilentProgress

if TYPE_CHECKING:
    from rich.console import Console
    from rich.progress import Task

    from slabsim.stack.sample import Stack


def announce_compilation(stack: Stack) -> None:
    """Say on a terminal that the first run of all takes longer."""
    from rich.console import Console

    from slabsim.engine.cache import is_compiled
    from slabsim.engine.pack import takes_scalar_path

    console = Console(stderr=True)
    entry = "solve" if takes_scalar_path(stack) else "solve_ports"
    if console.is_terminal and not is_compiled(entry):
        console.print("Compiling the engine for this processor, some 15 to 45 seconds, once ...")


def bar() -> Progress:
    """The bar on a terminal, silence elsewhere."""
    from rich.console import Console

    console = Console(stderr=True)
    return _Bar(console) if console.is_terminal else SilentProgress()


class _Bar:
    def __init__(self, console: Console) -> None:
        from rich.progress import (
            BarColumn,
            Progress,
            ProgressColumn,
            TaskProgressColumn,
            TextColumn,
            TimeRemainingColumn,
        )
        from rich.text import Text

        class Rate(ProgressColumn):
            def render(self, task: Task) -> Text:
                speed = task.finished_speed or task.speed
                return Text("starting" if speed is None else f"{speed:,.0f} points/s")

        self._progress = Progress(
            TextColumn("{task.completed:,.0f} of {task.total:,.0f}"),
            BarColumn(bar_width=16),  # ten million points fit into 80 columns
            TaskProgressColumn(),
            Rate(),
            TextColumn("left"),
            TimeRemainingColumn(),
            console=console,
        )

    def start(self, total_points: int, done_points: int) -> None:
        """Show the bar."""
        self._progress.start()
        self._task = self._progress.add_task("", total=total_points, completed=done_points)

    def advance(self, points: int) -> None:
        """Move the bar."""
        self._progress.advance(self._task, points)

    def stop(self) -> None:
        """Leave the bar as it is."""
        self._progress.stop()
