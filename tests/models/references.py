"""Check values from outside the project, as named tables with their source.

The project's sign holds here: F_z > 0 pushes the mover away (many sources count attraction positive; their numbers are
turned). mu0 = 4e-7 pi. Values are SI unless a name says mm.
"""

from __future__ import annotations

import mpmath
import numpy as np
from numpy.typing import NDArray

MU0 = 4e-7 * np.pi
MM = 1e-3

# G. Akoun, J.-P. Yonnet, "3D analytical calculation of the forces exerted between two cuboidal magnets", IEEE Trans.
# Magn. 20(5), 1962-1964, 1984: the example of its figures. Base 20 x 12 x 6 mm, mover 12 x 20 x 6 mm, both 0.38 T along
# +z, centres apart by (-4 + displacement, -4, 8) mm. Values: the published formula in 40 digits.
AKOUN_YONNET_J = 0.38
AKOUN_YONNET_CELL_MM = 4.0
AKOUN_YONNET_GAP_MM = 2.0
AKOUN_YONNET = np.array(
    [  # displacement mm, Fx, Fy, Fz on the mover N
        [0.0, 0.58835582, 0.58835582, -1.7736404],
        [2.0, 0.24506855, 0.62653628, -1.8556302],
        [4.0, 0.0, 0.63758044, -1.8533728],
        [8.0, -0.58835582, 0.58835582, -1.7736404],
        [10.0, -0.90863741, 0.51772929, -1.4668461],
        [12.0, -1.0676905, 0.42478811, -1.058563],
        [16.0, -1.0552341, 0.22064412, -0.23849515],
        [20.0, -0.56714627, 0.057292454, 0.41019894],
        [24.0, -0.070587771, -2.5028453e-5, 0.33053834],
        [30.0, 0.0441663, -0.0072877805, 0.1168275],
    ]
)
# The same figure, read from the printed graph every 2 mm (an open-source project's test): reading error 0.06 N.
AKOUN_YONNET_PRINTED_FX = np.array(
    [0.6, 0.25, 0.0, -0.25, -0.6, -0.9, -1.05, -1.1, -1.05, -0.88, -0.55, -0.25, -0.08, 0.0, 0.05]
)
AKOUN_YONNET_PRINTED_FZ = np.array(
    [-1.76, -1.85, -1.85, -1.85, -1.76, -1.47, -1.08, -0.64, -0.25, 0.15, 0.4, 0.43, 0.33, 0.25, 0.18]
)
AKOUN_YONNET_READING_N = 0.06
# Zero crossings of the same curves [mm]: Fz, then Fx (twice).
AKOUN_YONNET_FZ_ZERO_MM = 17.209761538
AKOUN_YONNET_FX_ZEROS_MM = (4.0, 25.739869278)

# Same magnets: -dF/dx, -dF/dy, -dF/dz at a centre offset [N/m]; the published formula differentiated in 40 digits.
# Their sum is zero: S. Earnshaw, Trans. Camb. Phil. Soc. 7, 97-112, 1842.
STIFFNESS = (  # (centre offset mm), (stiffness N/m)
    ((-4.0, -4.0, 8.0), (188.3060828, 188.3060828, -376.6121657)),
    ((6.0, -4.0, 8.0), (119.1082027, 165.3670967, -284.4752994)),
    ((0.0, 0.0, 6.5), (90.42350157, 90.42350157, -180.8470031)),
)

# Two coaxial cubes of 10 mm, 1.3 T: (gap mm, F_z N); Akoun-Yonnet formula in 40 digits.
CUBES = np.array(
    [
        [1.0, -34.40790915],
        [2.0, -24.79658159],
        [5.0, -11.10041555],
        [10.0, -3.80421237],
        [20.0, -0.78332605],
    ]
)
# The same cubes far apart: (centre distance mm, force over the point-dipole force 3 mu0 m^2 / (2 pi d^4)).
DIPOLE_RATIO = np.array([[50.0, 0.998390], [100.0, 0.999898], [200.0, 0.9999936]])

# Two blocks of 6 x 6 x 3 mm, 1.3 T, gap 1 mm: F_z N, in one piece or as 3 x 3 cells of 2 mm; Akoun-Yonnet formula.
BLOCK_6X6X3_AT_1MM = -6.380935244

# Two blocks of 40 x 40 x 20 mm, 1.3 T, centres apart by (20, 0, 30) mm: force N and moment N m on the mover about its
# own centre (magpylib 6.3, and the point symmetry of the pair: moment = -(d / 2) x F).
TORQUE_FORCE = np.array([-98.330, 0.0, -105.211])
TORQUE_OWN_CENTRE = 0.42283

# Alternating strips of pole pitch 5 mm, thickness 3 mm, 1.2 T on both parts: pressures from the Fourier series
# (4 Br^2 / (pi^2 mu0)) sum over odd n of exp(-n k g) (1 - exp(-n k t))^2 cos(n phi) / n^2, derived from the field of
# J. C. Mallinson, IEEE Trans. Magn. 9(4), 678-682, 1973. (gap mm, attraction at phi = 0, shear at pi / 2, Pa).
STRIP_REMANENCE = 1.2
STRIP_PITCH_MM = 5.0
STRIP_THICKNESS_MM = 3.0
STRIPS = np.array(
    [
        [0.1, 385188.014, 280842.721],
        [0.5, 269443.43289, 227119.72741],
        [1.0, 186961.29292, 171159.46635],
        [2.0, 96304.76041, 93939.21594],
        [5.0, 14441.78413, 14433.51374],
    ]
)
# (gap mm, attraction at phi = pi / 4, Pa), same series.
STRIPS_45 = np.array([[0.5, 156583.54638], [1.0, 120056.88721], [2.0, 66378.03094], [5.0, 10206.03149]])

# Enumerated optima of a pattern that faces its own copy (b = a): cells of 2 mm, thickness 3 mm, 1.3 T, all patterns
# evaluated with the closed form, optima spot-checked with magpylib. Attraction N; one of the tied patterns, row-major.
ENUMERATED_3X3 = (  # gap mm, largest attraction, its pattern, least attraction
    (0.1, 17.831774, "+++---++-", 12.482667),
    (0.5, 10.143999, "+--+--+--", 6.755699),
    (1.0, 6.380935, "+++++++++", None),
    (2.0, 3.707258, "+++++++++", None),
    (4.0, 1.508878, "+++++++++", None),
    (8.0, 0.364938, "+++++++++", None),
)
CHECKER_3X3_AT_01MM = 16.792734
UNIFORM_3X3_AT_05MM = 8.854110
ENUMERATED_4X4 = (
    (0.1, 31.915927, "+++-----++++---+"),
    (0.5, 18.797891, "++++++++--------"),
    (1.0, 12.525693, "++++++++--------"),
    (2.0, 6.461078, "++++++++++++++++"),
    (4.0, 3.012342, "++++++++++++++++"),
    (8.0, 0.879529, "++++++++++++++++"),
)
# Partner given, 4 x 4 cells of 1 mm, thickness 3 mm, 1.3 T, gap 1 mm: largest attraction over all patterns is the sum
# of |K b|, reached at the sign of K b.
LINEAR_PARTNER = "++--+--+--+++-+-"
LINEAR_BEST = "++--+--+--++--++"
LINEAR_BEST_N = 0.79185245
LINEAR_COPY_N = 0.78010404

# Uniform discs of radius 10 mm, thickness 3 mm, 1.3 T: (gap mm, F_z N), Hankel integral (D. Vokoun et al., JMMM
# 321(22), 3758-3763, 2009); and the same discs with a core of radius 10 / sqrt(2) mm against the ring round it, as a
# matched pair.
DISCS = np.array(
    [
        [0.5, -37.54911],
        [1.0, -30.28591],
        [2.0, -21.72353],
        [5.0, -10.54183],
        [8.0, -5.957984],
        [20.0, -1.009951],
    ]
)
CORE_RING = np.array([[0.5, -85.9686], [1.0, -59.46889], [2.0, -32.04769], [5.0, -7.676089]])
# Core radii 5.1 mm (base) and 8.5 mm (mover): attracts near, repels far; zero at 8.271537 mm.
TWO_RADII_CORES_MM = (5.1, 8.5)
TWO_RADII = np.array(
    [
        [0.5, -10.103786],
        [1.0, -6.690485],
        [2.0, -4.207980],
        [5.0, -1.204244],
        [10.0, 0.202305],
        [15.0, 0.266163],
        [20.0, 0.176741],
    ]
)
TWO_RADII_ZERO_MM = 8.271537


def pattern(text: str) -> NDArray[np.int8]:
    """Square pattern from a row-major text of + and -."""
    n = round(len(text) ** 0.5)
    return np.array([1 if sign == "+" else -1 for sign in text], dtype=np.int8).reshape(n, n)


# Eigenvalues of the attraction matrix of that lattice lie between these two [N]; all are positive.
LINEAR_EIGENVALUES = (0.0089, 0.196)


def sheet_kernel(name: str, u: float, v: float, w: float) -> float:
    """Interaction of two unit-charged unit squares in extended precision (60 digits).

    The published functions of Akoun and Yonnet (see above; energy, then forces) summed over the corner pairs of both
    sheets, without any rearrangement: what cancels costs digits that are there to spare. Their derivatives are
    differences over 1e-20.

    Args:
        name: "e" for 1/r; "x", "y", "z" for the components of r / r^3; two letters for their derivatives.
        u: Displacement along x.
        v: Displacement along y.
        w: Axial distance, > 0.
    """
    with mpmath.workdps(60):
        at = [mpmath.mpf(u), mpmath.mpf(v), mpmath.mpf(w)]
        if len(name) == 1:
            return float(_corner_sum(name, at))
        step = mpmath.mpf(10) ** -20
        axis = "xyz".index(name[1])
        ahead, behind = list(at), list(at)
        ahead[axis] += step
        behind[axis] -= step
        return float((_corner_sum(name[0], ahead) - _corner_sum(name[0], behind)) / (2 * step))


def _corner_sum(name: str, at: list[mpmath.mpf]) -> mpmath.mpf:
    total = mpmath.mpf(0)
    for i, weight_u in ((-1, 1), (0, -2), (1, 1)):
        for j, weight_v in ((-1, 1), (0, -2), (1, 1)):
            total += weight_u * weight_v * _akoun_yonnet(name, at[0] + i, at[1] + j, at[2])
    return total


def _akoun_yonnet(name: str, u: mpmath.mpf, v: mpmath.mpf, w: mpmath.mpf) -> mpmath.mpf:
    r = mpmath.sqrt(u * u + v * v + w * w)
    log_u, log_v, angle = mpmath.log(r - u), mpmath.log(r - v), mpmath.atan(u * v / (r * w))
    if name == "e":
        logs = u * (v * v - w * w) / 2 * log_u + v * (u * u - w * w) / 2 * log_v
        # They give the energy of opposite charges: minus the integral of 1/r.
        return -(logs + u * v * w * angle + r * (u * u + v * v - 2 * w * w) / 6)
    if name == "x":
        return (v * v - w * w) / 2 * log_u + u * v * log_v + v * w * angle + r * u / 2
    if name == "y":
        return (u * u - w * w) / 2 * log_v + u * v * log_u + u * w * angle + r * v / 2
    return -u * w * log_u - v * w * log_v + u * v * angle - r * w
