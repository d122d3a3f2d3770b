"""Ctrl-C and SIGTERM during a sweep: the first asks for an end after the block, the second ends at once."""

from __future__ import annotations

import signal
import threading
from types import FrameType, TracebackType
from typing import Any, Self

_SIGNALS = (signal.SIGINT, signal.SIGTERM)


class StopRequest:
    """Watches for the first SIGINT or SIGTERM while it is entered.

    The first one only sets `is_set` and gives the signals back to whoever had them, so that a
    second one acts at once. Python delivers signals to the main thread; elsewhere this does nothing.
    A signal that was ignored (as under nohup) stays ignored.
    """

    def __init__(self) -> None:
        self.is_set = False
        self._previous: dict[signal.Signals, Any] = {}

    def __enter__(self) -> Self:
        if threading.current_thread() is threading.main_thread():
            for number in _SIGNALS:
                previous = signal.getsignal(number)
                if previous not in (signal.SIG_IGN, None):  # None: not installed from Python
                    self._previous[number] = previous
                    signal.signal(number, self._receive)
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self._give_back()

    def _receive(self, number: int, frame: FrameType | None) -> None:
        self.is_set = True
        self._give_back()

    def _give_back(self) -> None:
        while self._previous:
            signal.signal(*self._previous.popitem())
