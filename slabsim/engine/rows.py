"""How a stack lies in the arrays of the kernels: kinds of elements, rows of the tables and of the workspace.

Shared by `pack.py`, which fills the tables, and `kernels.py`, which computes.
"""

LANES = 8  # points per vector instruction, at most
C = 64  # points per chunk: its rows stay in the first-level cache

# Kinds of element in a recipe
PLAIN, TRANSPARENT, UNIAXIAL, WIRES, SHEET, WIRE_BACK, WIRE_RUN, WIRE_JOINT, WIRE_FRONT = range(9)
# How a sheet's admittance depends on the angle
UNIFORM, PATCHES, STRIPS = range(3)

# Rows of `params` (second axis); a complex value takes two rows
DEPTH, EPS, INV_EPS, MU, INV_MU, EXCESS = 0, 1, 3, 5, 7, 9  # k0 d, ..., eps mu - eps_front mu_front
PLAIN_ROWS = 11  # as many rows a layer without wires needs
STRETCH = 11  # uniaxial: 1 - eps/eps_zz
KP2, KP, X_WIRE, ZC = 11, 12, 13, 15  # wires: (kp/k0)^2, kp/k0, X, zc
END_PP, END_PF, END_FP, END_FF = 17, 19, 21, 23  # products of the end conditions, front x back
NU, OMEGA = 0, 2  # WIRE_BACK, WIRE_FRONT: (v, psi) is a multiple of (nu, omega)
RATIO, LOAD = 0, 2  # WIRE_JOINT: kp behind / kp before; kp^2 Z A / eta0
Y_SHEET, TILT, FORM = 0, 2, 4  # SHEET: normalised admittance, 1/(2 eps_eff), UNIFORM | PATCHES | STRIPS
TEM, IDEAL = 25, 31  # perfect conductors in a non-magnetic host: p, c, g of the TEM mode, and the flag 1
N_PARAMS = 32

# Rows of `media`: the two half-spaces
FRONT_EPS, FRONT_MU, BACK_EPS, BACK_MU = 0, 1, 2, 4
E_OVER_H = 6  # from t of the magnetic to t of the electric field
N_MEDIA = 8
# Rows of the result of one polarization
R_AMPLITUDE, T_AMPLITUDE, R_POWER, T_POWER, A_POWER = 0, 2, 4, 5, 6
N_OUT = 7

# Rows of the workspace
S2, Q2 = N_PARAMS, N_PARAMS + 1
TE, TM = N_PARAMS + 2, N_PARAMS + 8  # a, b, t of each polarization
RUN = N_PARAMS + 14  # Pluecker: hv, h psi, e v, e psi, h e; then the vector h, v, e, psi
# Rows of a mode over a layer, counted from FIRST or SECOND: kappa^2, kappa, 1/|kappa|^2, functions, p, c, g, decay
K2, KAPPA, INV_SIZE, EM1, SIN, COS, WAVE_P, WAVE_C, WAVE_G, EXP = 0, 2, 4, 5, 6, 7, 8, 10, 12, 14
FIRST, SECOND = RUN + 18, RUN + 33
MODES = RUN + 48  # symmetric functions of the two modes of a wire layer
CC, D, H, Y, KK, PI, HW, YW = (MODES + 2 * j for j in range(8))
XC, YC, XG, YG, XW, YWW = (MODES + 16 + 2 * j for j in range(6))
MEAN, DA, DET, GAP = (MODES + 28 + 2 * j for j in range(4))
INV_GAP2, RARE = MODES + 36, MODES + 37
MINORS = MODES + 38
M_HP_HP, M_HV_HP, M_HV_EV, M_HP_HV, M_EV_HV, M_EV_HP, M_HP_EV, M_HV_EP, M_EP_HV = (MINORS + 2 * j for j in range(9))
RESULT = MINORS + 18  # TE: N_OUT rows, TM: N_OUT rows
N_ROWS = RESULT + 2 * N_OUT
