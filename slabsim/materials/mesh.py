"""The wire mesh: three orthogonal sets of wires, joined where they meet."""

from math import pi

from slabsim.errors import InputError
from slabsim.units import format_length


def stiffness(pitch: float, radius: float, kp: float) -> float:
    """Capacitance of the joined sets over that of one, l0 = 3/(1 + 2 kp^2/beta^2).

    Parameters
    ----------
    pitch, radius : float
        Side a of the cubic cell and wire radius r [m], 0 < 2 r < a.
    kp : float
        Plasma wavenumber of one set [rad/m].

    Returns
    -------
    float
        Between 0 and 3; the longitudinal mode of the mesh has k^2 = l0 (kh^2 - kp^2).

    Raises
    ------
    InputError
        If the wires overlap.

    Notes
    -----
    1/beta^2 = 2 (a/2 pi)^2 sum_{n>=1} [J0(2 pi n r/a)/n]^2 for line charges that are uniform along the three sets: the
    mean potential that one set puts on the wires of another; derived here, of the form published for the connected
    wire medium (from memory: Silveirinha and Fernandes, IEEE Trans. Microw. Theory Tech. 53, 1418, 2005). With
    Neumann's integral of J0^2 and sum cos(n u)/n^2 = pi^2/6 - pi u/2 + u^2/4 the sum is, for r < a/2,
    pi^2/6 - 8 r/a + pi^2 (r/a)^2.

    The charge crowds away from the nodes, which this neglects. Only the longitudinal mode feels l0: a mesh at normal
    incidence does not depend on it.
    """
    if not 0.0 < 2.0 * radius < pitch:
        raise InputError(
            f"radius = {format_length(radius)} with pitch = {format_length(pitch)}; "
            "the radius must be positive and less than half the pitch, else neighbouring wires touch"
        )
    thin = radius / pitch
    series = pi**2 / 6.0 - 8.0 * thin + (pi * thin) ** 2
    return 3.0 / (1.0 + 4.0 * (kp * pitch / (2.0 * pi)) ** 2 * series)
