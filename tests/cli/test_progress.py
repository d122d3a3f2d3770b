from io import StringIO

from rich.console import Console

from slabsim.cli.progress import _Bar, bar
from slabsim.sweeps.progress import SilentProgress


def test_bar_is_silent_in_a_pipe():
    assert isinstance(bar(), SilentProgress)


def test_bar_of_a_large_sweep_fits_into_80_columns():
    out, clock = StringIO(), [0.0]
    console = Console(file=out, width=80, force_terminal=True, color_system=None, get_time=lambda: clock[0])
    shown = _Bar(console)
    shown.start(9_999_999, 4_000_000)
    for clock[0] in (1.0, 2.0):
        shown.advance(1_000_000)
    shown.stop()
    last = [line for line in out.getvalue().replace("\r", "\n").split("\n") if "of 9,999,999" in line][-1]
    for word in ("6,000,000 of 9,999,999", "60%", "1,000,000 points/s", "left 0:00:04"):
        assert word in last
