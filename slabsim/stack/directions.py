"""Unit vectors along wires, exact where an angle is a multiple of 90 degrees."""

from math import cos, radians, sin
from typing import Literal

from slabsim.stack.sample import Direction


def along_axis(name: Literal["x", "y", "z"]) -> Direction:
    """Unit vector of an axis."""
    return (float(name == "x"), float(name == "y"), float(name == "z"))


def tilted(tilt_deg: float, azimuth_deg: float) -> Direction:
    """Unit vector at an angle from z, its projection on the faces at an azimuth from x [degrees]."""
    c, s = cos_sin_deg(tilt_deg)
    ca, sa = cos_sin_deg(azimuth_deg)
    return s * ca + 0.0, s * sa + 0.0, c + 0.0  # no -0


def cos_sin_deg(angle_deg: float) -> tuple[float, float]:
    """Cosine and sine of an angle [degrees], exact at multiples of 90."""
    turns, rest = divmod(angle_deg, 90.0)
    c, s = cos(radians(rest)), sin(radians(rest))
    return ((c, s), (-s, c), (-c, -s), (s, -c))[int(turns) % 4]
