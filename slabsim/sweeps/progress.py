"""Telling how far a sweep is."""

from __future__ import annotations

from typing import Protocol


class Progress(Protocol):
    """Whoever wants to know how far a sweep is.

    1. `start`: once, before the first block, with all points and those that were there already.
    2. `advance`: after every block, with its points.
    3. `stop`: once, at the end, also when the sweep fails.
    """

    def start(self, total_points: int, done_points: int) -> None: ...
    def advance(self, points: int) -> None: ...
    def stop(self) -> None: ...


class SilentProgress:
    """Tells nothing."""

    def start(self, total_points: int, done_points: int) -> None:
        """Do nothing."""

    def advance(self, points: int) -> None:
        """Do nothing."""

    def stop(self) -> None:
        """Do nothing."""
