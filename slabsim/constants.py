"""Physical constants in SI units, CODATA 2018.

Written out because `scipy.constants` would add a tenth of a second to every command.
"""

from math import pi

C0 = 299_792_458.0  # speed of light in vacuum [m/s], exact
MU0 = 1.256_637_062_12e-6  # vacuum permeability [H/m]
EPS0 = 1.0 / (MU0 * C0**2)  # vacuum permittivity [F/m]
ETA0 = MU0 * C0  # wave impedance of vacuum [ohm]
H_OVER_E = 6.626_070_15e-34 / 1.602_176_634e-19  # photon energy per frequency [eV/Hz], exact
TWO_PI = 2.0 * pi
