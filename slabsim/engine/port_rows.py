"""How a stack lies in the arrays of the four-port kernels.

Shared by `port_pack.py`, which fills the arrays, and `ports.py`, which computes.

A recipe has one row of integers for each element, back to front (columns below), one table of frequency-only
values with shape (n_rows, n_freqs) for all of them, and, for elements that depend on frequency and angle in ways of
their own (grids, plates), a second one with shape (n_point_rows, n_freqs, n_angles). A complex value takes two rows.
"""

# Kinds of element
DIAGONAL, MIRROR, TILTED, SHEET, GRID, PLATES, RESCALE, SERIES = range(8)

# Columns of the recipe
KIND = 0
ROW = 1  # first row of the table
POINT_ROW = 2  # first row of the point table
N_PORTS = 3  # 2 and one for each set of wires that crosses the faces
FIRST_TERM, N_TERMS = 4, 5  # rows of `terms`: the entries of the generator
FIRST_RESONANCE, N_RESONANCES = 6, 7  # rows of the sets parallel to the faces, counted from ROW on
FIRST_END = 8  # rows of `ends`, one for each port beyond 2
PORT = 9  # SERIES: the port of the state
N_COLUMNS = 10

# Columns of `terms`: an entry of the generator is the sum of coefficient times multiplier
BLOCK, ENTRY, MULTIPLIER, COEFFICIENT = range(4)  # A, B or D; i n + j; ONE...; row of the table, from ROW on
BLOCK_A, BLOCK_B, BLOCK_D = range(3)  # also their slots in the workspace
ONE, SINE, COSINE2, RESONANCE = range(4)  # 1, s, q^2, and from 3 on 1/(c0 + c1 q^2) of the resonances

# Columns of `ends`: the port of the state that goes on behind, or OWN; whether the port goes on in front; rows of rho
BEHIND, KEPT, RHO_BACK, RHO_FRONT = range(4)
OWN = -1

MOST_SETS = 16  # sets of wires in a layer, parallel to the faces, that the workspace has room for

# Rows of an element, from ROW on
DEPTH = 0  # layers: k0 d
Y_SHEET, TILT, FORM = 0, 2, 4  # SHEET: as in `rows`
DIRECTION = 0  # GRID: np^2, np ns, ns^2 over 2
GAIN, LOSS = 0, 1  # RESCALE: (sqrt(r) + 1/sqrt(r))/2, (sqrt(r) - 1/sqrt(r))/2, r = y in front over y behind
LOAD = 0  # SERIES: half the impedance, with its imaginary part

# Rows of the media; y is the reference admittance of the state
FRONT_EPS, FRONT_MU, BACK_EPS, BACK_MU, FRONT_Y, BACK_Y = 0, 1, 2, 4, 6, 7
N_MEDIA = 8
