"""Interaction of two equal square charge sheets: closed forms near, quadrature far.

Two cells of width p carry unit surface charge; (u, v, w) is the vector from the centre of the base's sheet to the
centre of the mover's. Each kernel is the fourfold integral of a Coulomb expression over both cells. Over the
lateral coordinates the integrand depends only on differences, so the fourfold integral is a second difference in u
and in v of a double-double antiderivative (the functions of Akoun and Yonnet, IEEE Trans. Magn. 20(5), 1984, written
with asinh instead of the logarithm: what differs is linear in u or v and vanishes in the second differences).

Far switch: the second differences lose digits as (distance / p)^3. Beyond ``FAR_SWITCH`` cell widths the same integral
is taken by a Gauss rule for the triangular weight (1 - |s|) that the two cells' overlap has; both forms agree to
about 1e-11 of the entry there.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

FAR_SWITCH = 9.0
"""Centre distance, in cell widths, beyond which quadrature replaces the closed form."""

KERNELS = ("e", "x", "y", "z", "xx", "yy", "xy", "zz")
"""e: 1/r; x, y, z: components of (u, v, w)/r^3; xx, yy, xy, zz: derivatives d(x)/du, d(y)/dv, d(x)/dv, d(z)/dw."""

PARITY: dict[str, tuple[int, int]] = {
    "e": (1, 1), "z": (1, 1), "zz": (1, 1), "xx": (1, 1), "yy": (1, 1), "x": (-1, 1), "y": (1, -1), "xy": (-1, -1),
}  # fmt: skip
"""Sign of each kernel under (u -> -u, v -> -v)."""

_CONTACT = 1e-9
"""Sheets in contact are taken this fraction of a cell apart where a derivative of the force diverges."""


def _triangle_rule(order: int) -> tuple[Array, Array]:
    """Nodes and weights of the Gauss rule on [-1, 1] for the weight 1 - |s| (Golub-Welsch on exact moments)."""
    moments = np.array([0.0 if k % 2 else 2.0 / ((k + 1.0) * (k + 2.0)) for k in range(2 * order + 1)])
    upper = np.linalg.cholesky(np.array([[moments[i + j] for j in range(order + 1)] for i in range(order + 1)])).T
    beta = np.array([upper[j + 1, j + 1] / upper[j, j] for j in range(order - 1)])
    nodes, vectors = np.linalg.eigh(np.diag(beta, 1) + np.diag(beta, -1))
    return nodes, vectors[0] ** 2


_NODES, _WEIGHTS = _triangle_rule(5)


def sheet_kernels(names: tuple[str, ...], u: Array, v: Array, w: Array, cell: float) -> dict[str, Array]:
    """Kernels of two unit-charged square sheets on a grid of displacements.

    Args:
        names: Which of ``KERNELS``.
        u: Displacements along x, evenly spaced by ``cell``, shape (nu,) [m].
        v: Displacements along y, evenly spaced by ``cell``, shape (nv,) [m].
        w: Axial distances of the sheets, >= 0, shape (nw,) [m].
        cell: Width of both cells [m].

    Returns:
        For each name an array (nw, nv, nu): "e" [m^3], first-order kernels [m^2], second-order kernels [m].
    """
    un, vn, wn = u / cell, v / cell, w / cell
    near_u, near_v = np.abs(un) < FAR_SWITCH, np.abs(vn) < FAR_SWITCH
    out: dict[str, Array] = {}
    far = un[None, None, :] ** 2 + vn[None, :, None] ** 2 + wn[:, None, None] ** 2 >= FAR_SWITCH**2
    index = np.nonzero(far)
    near_w = wn < FAR_SWITCH
    for name in names:
        table = np.zeros(far.shape)
        if near_u.any() and near_v.any() and near_w.any():
            block = np.ix_(near_w, near_v, near_u)
            table[block] = _second_differences(name, un[near_u], vn[near_v], wn[near_w])
        if index[0].size:
            table[index] = _far(name, un[index[2]], vn[index[1]], wn[index[0]])
        out[name] = table * cell ** _power(name)
    return out


def _power(name: str) -> int:
    """Power of the length unit of a kernel."""
    return 3 if name == "e" else 3 - len(name)


def _second_differences(name: str, u: Array, v: Array, w: Array) -> Array:
    """Closed form in units of the cell width, shape (nw, nv, nu)."""
    nodes_u = np.concatenate([u[:1] - 1.0, u, u[-1:] + 1.0])
    nodes_v = np.concatenate([v[:1] - 1.0, v, v[-1:] + 1.0])
    if name in ("xx", "yy", "xy", "zz"):
        w = np.maximum(w, _CONTACT)
    table = _antiderivative(name, nodes_u[None, None, :], nodes_v[None, :, None], w[:, None, None])
    rows = (table[:, 2:, :] - table[:, 1:-1, :]) - (table[:, 1:-1, :] - table[:, :-2, :])
    return (rows[:, :, 2:] - rows[:, :, 1:-1]) - (rows[:, :, 1:-1] - rows[:, :, :-2])


def _asinh_ratio(a: Array, b2: Array) -> Array:
    """asinh(a / sqrt(b2)), 0 where b2 = 0: every use multiplies it by something that vanishes there."""
    safe = np.where(b2 > 0.0, b2, 1.0)
    return np.where(b2 > 0.0, np.arcsinh(a / np.sqrt(safe)), 0.0)


def _antiderivative(name: str, u: Array, v: Array, w: Array) -> Array:
    """Double antiderivative in u and in v of a Coulomb expression (broadcast)."""
    r = np.sqrt(u * u + v * v + w * w)
    lu, lv = _asinh_ratio(u, v * v + w * w), _asinh_ratio(v, u * u + w * w)
    if name == "zz":
        return u * lu + v * lv - 2.0 * r
    if name == "xx":
        return r - v * lv
    if name == "yy":
        return r - u * lu
    # arctan2 keeps the limit of arctan(uv / (wr)) for sheets in contact
    angle = np.arctan2(u * v, w * r)
    if name == "xy":
        return -v * lu - u * lv + w * angle
    if name == "z":
        return w * (u * lu + v * lv - r) + u * v * angle
    x = 0.5 * (w * w - v * v) * lu - u * v * lv + v * w * angle + 0.5 * r * u
    if name == "x":
        return x
    y = 0.5 * (w * w - u * u) * lv - u * v * lu + u * w * angle + 0.5 * r * v
    if name == "y":
        return y
    # homogeneity: the potential's antiderivative has degree 3 and the force is minus its gradient
    z = w * (u * lu + v * lv - r) + u * v * angle
    return -(u * x + v * y + w * z) / 3.0


def _far(name: str, u: Array, v: Array, w: Array) -> Array:
    """The same integral by the triangle rule, in units of the cell width; shape of u."""
    total = np.zeros_like(u)
    for weight_u, s in zip(_WEIGHTS, _NODES, strict=True):
        for weight_v, t in zip(_WEIGHTS, _NODES, strict=True):
            total += weight_u * weight_v * _coulomb(name, u + s, v + t, w)
    return total


def _coulomb(name: str, u: Array, v: Array, w: Array) -> Array:
    """The integrand between two points."""
    r2 = u * u + v * v + w * w
    if name == "e":
        return np.asarray(1.0 / np.sqrt(r2))
    component = {"x": u, "y": v, "z": w}
    first = component[name[0]]
    if len(name) == 1:
        return np.asarray(first / (r2 * np.sqrt(r2)))
    same = r2 if name[0] == name[1] else 0.0
    return np.asarray((same - 3.0 * first * component[name[1]]) / (r2 * r2 * np.sqrt(r2)))
