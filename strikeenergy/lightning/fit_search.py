"""The Heidler function that comes nearest to given figures: tables of its shape, and the search in them.

The targets of a Heidler function are its peak and time scale times functions of a = tau1/tau2 and n alone. In logarithms
the two scales are therefore linear; they are projected out, and only a (and n, where it is free) is searched, in tables
that serve all elements of an array at once (variable projection).
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass
from functools import lru_cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

from strikeenergy.lightning.fit_targets import DESIGN, Array, Fitted, log_figures
from strikeenergy.lightning.smooth_shapes import Heidler

__all__ = ["MOST_N", "Projection", "projection_of", "scaled_heidler", "search_line", "search_plane"]

MOST_N = 120.0
"""Largest front exponent."""
_LOW = -16.0  # ln(a/n) from here to 0
_NODES = 3001
_CHUNK = 1024


def _shape_logs(log_a: Any, n: Any, names: Iterable[str], definition: str) -> Array:
    """ln of the named figures of the Heidler function with unit peak and tau2 = 1; last axis."""
    w = Heidler(np.ones(np.shape(log_a)), np.exp(log_a), 1.0, n)
    return log_figures(w, names, definition)


@lru_cache(maxsize=16)
def _line(n: float, definition: str) -> tuple[Array, Array]:
    """Nodes in ln a, and the figures there, for one n."""
    log_a = np.linspace(_LOW, -1e-9, _NODES) + np.log(n)
    return log_a, _shape_logs(log_a, n, DESIGN, definition)


@lru_cache(maxsize=4)
def _plane(definition: str) -> tuple[Array, Array, Array]:
    """Nodes in ln(a/n) and ln n, and the figures there."""
    ratio, log_n = np.linspace(_LOW, -1e-9, 241), np.linspace(0.0, np.log(MOST_N), 61)
    grid_n = np.exp(np.broadcast_to(log_n, (ratio.size, log_n.size)))
    return ratio, log_n, _shape_logs(ratio[:, None] + np.log(grid_n), grid_n, DESIGN, definition)


@dataclass(frozen=True, eq=False)
class Projection:
    """The two directions that the scales of peak and time cannot reach, and those that they can."""

    names: tuple[str, ...]
    columns: list[int]
    rest: Array
    scales: Array

    def split(self, logs: Array) -> tuple[Array, Array]:
        """Return what must vanish, and ln(peak), ln(time scale)."""
        return logs @ self.rest, logs @ self.scales


@lru_cache(maxsize=64)
def projection_of(names: tuple[str, ...]) -> Projection:
    """Return the directions for the targets of these names."""
    design = np.array([DESIGN[name] for name in names])
    left, _, _ = np.linalg.svd(design)
    return Projection(names, [list(DESIGN).index(n) for n in names], left[:, 2:], np.linalg.pinv(design).T)


@lru_cache(maxsize=16)
def _line_table(projection: Projection, n: float, definition: str) -> tuple[Array, Array, Array]:
    """Nodes in ln a, what must vanish there, and the coefficients of its cubic spline."""
    from scipy.interpolate import CubicSpline

    nodes, logs = _line(n, definition)
    table = projection.split(logs[:, projection.columns])[0]
    # (interval, power, direction), highest power first: one gather serves value and derivatives.
    return nodes, table, np.ascontiguousarray(CubicSpline(nodes, table).c.swapaxes(0, 1))


@lru_cache(maxsize=16)
def _plane_table(projection: Projection, definition: str) -> tuple[Array, Array, Array, list[Any]]:
    """Nodes in ln(a/n) and ln n, what must vanish there, and its splines."""
    from scipy.interpolate import RectBivariateSpline

    ratio, log_n, logs = _plane(definition)
    table = projection.split(logs[..., projection.columns])[0]
    splines = [RectBivariateSpline(ratio, log_n, table[..., k], kx=5, ky=5) for k in range(table.shape[-1])]
    return ratio, log_n, table, splines


def search_line(target: Array, projection: Projection, n: float, definition: str) -> Array:
    """Find the best ln a at a fixed n, for targets (element, target) in logarithms."""
    nodes, table, coefficients = _line_table(projection, n, definition)
    want, _ = projection.split(target)
    coarse, step = np.arange(0, _NODES, 20), nodes[1] - nodes[0]
    best = np.empty(len(want))
    for start in range(0, len(want), _CHUNK):
        goal = want[start : start + _CHUNK]
        middle = _nearest(goal, table[coarse])
        x = nodes[coarse[middle]]
        low, high = (
            nodes[coarse[np.maximum(middle - 1, 0)]],
            nodes[coarse[np.minimum(middle + 1, coarse.size - 1)]],
        )
        for _ in range(60):
            cell = np.minimum(((x - nodes[0]) / step).astype(int), _NODES - 2)
            c, d = coefficients[cell], (x - nodes[cell])[:, None]
            off = ((c[:, 0] * d + c[:, 1]) * d + c[:, 2]) * d + c[:, 3] - goal
            first, second = (3 * c[:, 0] * d + 2 * c[:, 1]) * d + c[:, 2], 6 * c[:, 0] * d + 2 * c[:, 1]
            uphill, curve = (off * first).sum(axis=1), (first**2 + off * second).sum(axis=1)
            low, high = np.where(uphill < 0, x, low), np.where(uphill >= 0, x, high)
            newton = x - uphill / np.where(curve > 0, curve, 1.0)
            new = np.where((curve > 0) & (newton >= low) & (newton <= high), newton, (low + high) / 2)
            moved, x = np.abs(new - x).max(), new
            if moved < 1e-13 * -_LOW:
                break
        best[start : start + _CHUNK] = x
    return best


def search_plane(target: Array, projection: Projection, definition: str) -> tuple[Array, Array]:
    """Find the best ln a and n together (Levenberg and Marquardt, on a table)."""
    ratio, log_n, table, splines = _plane_table(projection, definition)
    want, _ = projection.split(target)

    def off(at: Array, goal: Array, du: int = 0, dv: int = 0) -> Array:
        values = np.stack([s.ev(at[:, 0], at[:, 1], du, dv) for s in splines], axis=1)
        return values if du or dv else values - goal

    x, r = np.empty((len(want), 2)), np.full(want.shape, np.inf)
    # The valley of the residual is narrow and may have several bottoms: where the nearest node of the whole table leads
    # near a solution but not to one, start again from the nearest node of one n after another.
    for low, high in [(0, 61)] + [(i, i + 1) for i in range(0, 61, 4)]:
        size = np.abs(r).max(axis=1)
        todo = np.flatnonzero((size > 1e-9) & ((size < 5e-3) | np.isinf(size)))
        if not todo.size:
            break
        u, v = (grid.ravel() for grid in np.meshgrid(ratio[::6], log_n[low:high:4], indexing="ij"))
        first = _nearest(want[todo], table[::6, low:high:4].reshape(u.size, -1))
        at, left = _descend(off, np.stack([u[first], v[first]], axis=1), want[todo], ratio[-1], log_n[-1])
        better = (left**2).sum(1) < (r[todo] ** 2).sum(1)
        x[todo[better]], r[todo[better]] = at[better], left[better]
    return x[:, 0] + x[:, 1], np.exp(x[:, 1])


def _nearest(want: Array, nodes: Array) -> NDArray[np.intp]:
    """Index of the nearest node to each row, some rows at a time."""
    out = np.empty(len(want), dtype=np.intp)
    for start in range(0, len(want), _CHUNK):
        goal = want[start : start + _CHUNK]
        distance = sum((goal[:, None, k] - nodes[:, k]) ** 2 for k in range(nodes.shape[1]))
        out[start : start + _CHUNK] = np.asarray(distance).argmin(axis=1)
    return out


def _descend(
    off: Callable[..., Array], x: Array, want: Array, most_u: float, most_v: float
) -> tuple[Array, Array]:
    """Levenberg and Marquardt's method on all elements at once; return the places and the residuals there."""
    active, damping, r = np.arange(len(want)), np.full(len(want), 1e-3), off(x, want)
    for _ in range(80):
        at, goal, now, m = x[active], want[active], r[active], damping[active]
        ju, jv = off(at, goal, 1, 0), off(at, goal, 0, 1)
        gu, gv = (ju * now).sum(1), (jv * now).sum(1)
        a, b, c = (ju**2).sum(1), (ju * jv).sum(1), (jv**2).sum(1)
        a, c = a + m * (a + 1e-12), c + m * (c + 1e-12)
        det = np.maximum(a * c - b * b, 1e-300)
        step = np.stack([(c * gu - b * gv), (a * gv - b * gu)], axis=1) / det[:, None]
        new = np.clip(at - step, [_LOW, 0.0], [most_u, most_v])
        tried = off(new, goal)
        better = (tried**2).sum(1) <= (now**2).sum(1)
        damping[active] = np.where(better, np.maximum(m / 10, 1e-13), m * 10)
        x[active[better]], r[active[better]] = new[better], tried[better]
        active = active[(np.abs(new - at).max(axis=1) > 1e-13) & (damping[active] < 1e8)]
        if not active.size:
            break
    return x, r


def scaled_heidler(target: Array, projection: Projection, log_a: Array, n: Any, definition: str) -> Fitted:
    """Add the two scales to a shape."""
    logs = np.broadcast_to(_shape_logs(log_a, n, projection.names, definition), target.shape)
    scales = projection.split(target - logs)[1]
    peak, scale = np.exp(scales).T
    design = np.array([DESIGN[name] for name in projection.names])
    return Heidler(peak, np.exp(log_a) * scale, scale, n), logs + scales @ design.T - target
