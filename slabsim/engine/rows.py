"""How a stack lies in the arrays of the kernels: kinds of elements, rows of the tables and of the workspace.

Shared by `pack.py`, which fills the tables, `kernels.py`, which computes, and `fields.py`, which reads the workspace.
"""

C = 64  # points per chunk: its rows stay in the first-level cache

# Kinds of element in a recipe
PLAIN, UNIAXIAL, WIRES, SHEET, WIRE_BACK, WIRE_RUN, WIRE_JOINT, WIRE_FRONT = range(8)
# How a sheet's admittance depends on the angle
UNIFORM, PATCHES, STRIPS = range(3)

# Rows of `params` (second axis); a complex value takes two rows
DEPTH, EPS, INV_EPS, MU, INV_MU, EXCESS = 0, 1, 3, 5, 7, 9  # k0 d, ..., eps mu - eps_front mu_front
STRETCH = 11  # uniaxial: 1 - eps/eps_zz
KP2, KP, X_WIRE, ZC = 11, 12, 13, 15  # wires: (kp/k0)^2, kp/k0, X, zc
END_PP, END_PF, END_FP, END_FF = 17, 19, 21, 23  # products of the end conditions, front x back
NU, OMEGA = 0, 2  # WIRE_BACK, WIRE_FRONT: (v, psi) is a multiple of (nu, omega)
RATIO, LOAD = 0, 2  # WIRE_JOINT: kp behind / kp before; kp^2 Z A / eta0
Y_SHEET, TILT, FORM = 0, 2, 4  # SHEET: normalised admittance, 1/(2 eps_eff), UNIFORM | PATCHES | STRIPS
N_PARAMS = 25

# Rows of `media`: the two half-spaces and the wave number
FRONT_EPS, FRONT_MU, BACK_EPS, BACK_MU = 0, 1, 2, 4
N_MEDIA = 6
# Rows of `out`
R_RE, R_IM, T_RE, T_IM, R_POWER, T_POWER = range(6)
N_OUT = 6

# Rows of the workspace
S2, Q2 = N_PARAMS, N_PARAMS + 1
TE, TM = N_PARAMS + 2, N_PARAMS + 8  # a, b, t of each polarization
RUN = N_PARAMS + 14  # Pluecker: hv, h psi, e v, e psi, h e; then the vector h, v, e, psi
MODES = RUN + 18  # symmetric functions of the two modes of a wire layer
CC, D, H, Y, KK, PI, HW, YW = (MODES + 2 * j for j in range(8))
XC, YC, XG, YG, XW, YWW = (MODES + 16 + 2 * j for j in range(6))
MEAN, DA, DET, L1, L2, GAP = (MODES + 28 + 2 * j for j in range(6))
RARE, SCALE = MODES + 40, MODES + 41  # marks of `_modes`; the last normalisation
RESULT = MODES + 42  # TE: N_OUT rows, TM: N_OUT rows
N_ROWS = RESULT + 2 * N_OUT
