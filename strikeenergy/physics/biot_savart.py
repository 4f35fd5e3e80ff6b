"""Field, force, moment and inductance of conductors of any shape, made of straight segments.

Field of the segment from ``a`` to ``b`` that carries i, at a point p, with r1 = p − a, r2 = p − b, d = b − a::

    B = (mu0·i/4π)·(d × r1)·(R1 + R2)/(R1·R2·(R1·R2 + r1·r2 + c²)),    R = sqrt(|r|² + c²)

It is the law of Biot and Savart integrated along the segment, with the distance in it replaced by R. For c = 0 it is
the filament. A round wire of radius r is met by the **cut-off** c = r where the current flows at its surface, and by
c = r·exp(−1/4) where it fills the section (the two ends of a bracket: a lightning front is like the first, its tail
like the second). These c are the geometric mean distances of a circle's line and area, so that the self-inductance of
a ring, and the force F = ½·i²·dL/dx on any side of a loop, come out as in the closed forms (``loops``), to the order
(c/length)². At a right-angle corner it equals the usual "start the integral at x = c".

Units: m, A, T, N, N·m, H, N/m; shapes as stated, points and vectors have the three components last. ``share`` is the
part of the common current in a segment (1; −1 for a return path drawn in the same direction; 1/n for one of n), and
``i2`` the square of the common current (A²), or W/R (A²·s): then forces are impulses (N·s).

Source: Biot and Savart; F. W. Grover, Inductance Calculations (1946) for the geometric mean distances.

Validity: quasi-static; segments many radii long (arcs: many short segments that turn by small angles); a circuit is
closed, or its missing return is stated, since only closed circuits have F12 = −F21 and no force on themselves.
Between different *wires* c = 0: round wires with a current symmetric about the axis act on each other as filaments.
Within one wire, legs at the distance D < 10·r act on each other by a factor 1/(1 + (c/D)²) too weakly.

Leaves out: crowding of the current by a near neighbour, induced currents, steel, motion, the exact field inside and
within a radius or two of a wire.
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from strikeenergy.physics import magnetics

__all__ = [
    "Loads",
    "Segments",
    "arc_points",
    "beside",
    "by_leg",
    "chain",
    "cutoffs",
    "distances",
    "field",
    "field_fast",
    "force_per_length",
    "forces",
    "inductance",
    "midpoint_forces",
]

Array = NDArray[np.float64]
MU0_4PI = 1e-7
_BLOCK = 1 << 18
_TINY = 1e-300


class Segments(NamedTuple):
    """Straight segments, n of them."""

    start: Array
    """Where each begins (n, 3), m."""
    end: Array
    """Where each ends (n, 3), m: the current flows from start to end."""
    share: Array
    """Part of the common current in each (n,)."""
    leg: NDArray[np.intp]
    """Number of the leg that each belongs to (n,): an arc of many segments is one leg."""
    wire: NDArray[np.intp]
    """Number of the wire that each belongs to (n,). Wires that touch must be one wire."""


class Loads(NamedTuple):
    """Force and moment on each segment or leg."""

    force: Array
    """(n, 3), N (or N·s with ``i2`` = W/R)."""
    moment: Array
    """(n, 3) about the point asked for, N·m (or N·m·s)."""


# -- geometry ----------------------------------------------------------------------------------------------


def cutoffs(radius: float) -> tuple[float, float]:
    """Cut-offs (m) of a round wire: current at the surface, current spread over the section. A bracket."""
    return radius, float(magnetics.BEND_CUTOFF_UNIFORM(r=radius))


def chain(
    points: ArrayLike, share: float = 1.0, *, closed: bool = False, legs: ArrayLike | None = None
) -> Segments:
    """Make one wire of a polyline.

    Args:
        points: corners in the order of the current (n, 3), m.
        share: part of the common current.
        closed: whether the last point is joined to the first: the return path belongs to the wire.
        legs: number of the leg of each segment; by default each segment is a leg.

    Raises:
        ValueError: fewer than two points, not three components, or a segment without length.
    """
    p = np.asarray(points, dtype=np.float64)
    if p.ndim != 2 or p.shape[1] != 3 or len(p) < 2:
        raise ValueError(f"a path needs at least two points of three coordinates, not an array of {p.shape}")
    if closed:
        p = np.concatenate([p, p[:1]])
    start, end = p[:-1], p[1:]
    flat = np.flatnonzero(~(np.linalg.norm(end - start, axis=1) > 0))
    if flat.size:
        raise ValueError(f"segment {flat[0] + 1} of the path has no length")
    n = len(start)
    number = np.arange(n) if legs is None else np.asarray(legs, dtype=np.intp)
    if number.shape != (n,):
        raise ValueError(f"{n} segments need {n} leg numbers, not {number.shape}")
    return Segments(start, end, np.full(n, float(share)), number, np.zeros(n, dtype=np.intp))


def beside(*wires: Segments) -> Segments:
    """Put wires that do not touch together: legs and wires are numbered on."""
    legs, numbers, leg, wire = [], [], 0, 0
    for w in wires:
        legs.append(w.leg + leg)
        numbers.append(w.wire + wire)
        leg, wire = int(legs[-1].max()) + 1, int(numbers[-1].max()) + 1
    parts = [np.concatenate([w[k] for w in wires]) for k in range(3)]
    return Segments(parts[0], parts[1], parts[2], np.concatenate(legs), np.concatenate(numbers))


def arc_points(
    centre: ArrayLike, start: ArrayLike, axis: ArrayLike, angle: float, number: int, rise: float = 0.0
) -> Array:
    """Points (number + 1, 3) along an arc, or a helix, from ``start`` about the axis, right-handed, by ``angle`` (rad).

    The segments between them are chords: against the true arc, fields and forces are off by about
    (angle/number)²/12 of themselves (a whole circle's field at its centre is too high by (N/π)·tan(π/N)).

    Args:
        centre: a point on the axis (m).
        start: the first point (m).
        axis: direction of the axis.
        angle: turned through (rad); more than 2π for a coil.
        number: of segments.
        rise: along the axis over the whole angle (m).
    """
    c, p = np.asarray(centre, dtype=np.float64), np.asarray(start, dtype=np.float64)
    k = np.asarray(axis, dtype=np.float64)
    k = k / np.linalg.norm(k)
    along = k * np.dot(p - c, k)
    u = p - c - along
    t = np.linspace(0.0, angle, number + 1)[:, None]
    up = np.linspace(0.0, rise, number + 1)[:, None]
    return np.asarray(c + along + u * np.cos(t) + np.cross(k, u) * np.sin(t) + k * up)


def distances(segments: Segments) -> Array:
    """Smallest distance (n, n), m, between the axes of each two segments; 0 where they touch or cross.

    The minimum over both of |a + s·d − a' − t·d'|² for s, t in 0..1: the stationary point where it lies within, else
    on one of the four edges.
    """
    a, d = segments.start, segments.end - segments.start
    w = a[:, None] - a[None]
    dd = np.einsum("ik,ik->i", d, d)
    cross = np.einsum("ik,jk->ij", d, d)
    dw, ew = np.einsum("ik,ijk->ij", d, w), np.einsum("jk,ijk->ij", d, w)
    det = dd[:, None] * dd[None] - cross**2
    safe = np.where(det > 1e-12 * dd[:, None] * dd[None], det, np.inf)

    def gap(s: Array, t: Array) -> Array:
        return np.asarray(np.linalg.norm(w + s[..., None] * d[:, None] - t[..., None] * d[None], axis=-1))

    s, t = (cross * ew - dd[None] * dw) / safe, (dd[:, None] * ew - cross * dw) / safe
    inside = (safe < np.inf) & (s >= 0) & (s <= 1) & (t >= 0) & (t <= 1)
    best = np.where(inside, gap(s, t), np.inf)
    for end in (0.0, 1.0):
        fixed = np.full_like(dw, end)
        best = np.minimum(best, gap(fixed, np.clip((ew + end * cross) / dd[None], 0, 1)))
        best = np.minimum(best, gap(np.clip((end * cross - dw) / dd[:, None], 0, 1), fixed))
    return best


# -- field -------------------------------------------------------------------------------------------------


def _pairs(p: Array, s: Segments, c2: Array | float) -> tuple[Array, Array, Array, Array]:
    """Return d × r1 (m, n, 3), R1, R2 and ((R1 + R2)² − d²)/2 (m, n), for points (m, 3) and n segments."""
    d = s.end - s.start
    r1, r2 = p[:, None] - s.start[None], p[:, None] - s.end[None]
    q1, q2 = np.einsum("ijk,ijk->ij", r1, r1), np.einsum("ijk,ijk->ij", r2, r2)
    dot = np.einsum("ijk,ijk->ij", r1, r2) + c2
    # d × r1 = d × r2: from the nearer end it is the more exact.
    normal = np.cross(d[None], np.where((q2 < q1)[..., None], r2, r1))
    a, b = np.sqrt(q1 + c2), np.sqrt(q2 + c2)
    product = a * b
    # Beside the segment R1·R2 and r1·r2 nearly cancel. There (R1·R2)² − (r1·r2)² = |d × r1|² + c²·d² serves.
    square = np.einsum("ijk,ijk->ij", normal, normal) + c2 * np.einsum("jk,jk->j", d, d)
    half = np.where(dot > 0, product + dot, square / np.where(dot > 0, 1.0, product - dot + _TINY))
    return normal, a, b, half


def _field(p: Array, s: Segments, c2: Array | float) -> Array:
    normal, a, b, half = _pairs(p, s, c2)
    # On the axis itself a straight filament does not push itself sideways: zero, and not the rounding of a position.
    size = max(np.abs(p).max(), np.abs(s.start).max(), np.abs(s.end).max())
    d = s.end - s.start
    nearest = (1e-14 * size) ** 2 * np.einsum("jk,jk->j", d, d)
    on_axis = (np.einsum("ijk,ijk->ij", normal, normal) <= nearest) | (half <= 0)
    weight = MU0_4PI * s.share * (a + b) / np.where(on_axis, 1.0, a * b * half)
    return np.asarray(np.einsum("ij,ijk->ik", np.where(on_axis, 0.0, weight), normal))


def field(points: ArrayLike, segments: Segments, cutoff: float = 0.0) -> Array:
    """Magnetic flux density (T per A of the common current), shape of ``points`` (..., 3).

    Well conditioned at every distance; zero on the axis of a segment and on its extension.

    ``cutoff`` is c of the wires (m), 0 for filaments.
    """
    p = np.asarray(points, dtype=np.float64)
    flat = p.reshape(-1, 3)
    rows = max(1, _BLOCK // (8 * len(segments.start)))
    out = np.empty_like(flat)
    for k in range(0, len(flat), rows):
        out[k : k + rows] = _field(flat[k : k + rows], segments, cutoff**2)
    return out.reshape(p.shape)


def field_fast(points: ArrayLike, segments: Segments, cutoff: float = 0.0) -> Array:
    """``field`` for many points and many segments, an order of magnitude faster than the textbook form.

    With s = R1 + R2 and p = R1·R2 the field is Σ w·(d × (x − a)), w = 2·s/(p·(s² − d²)): only distances per pair, then
    x enters outside the sum, as (Σ w·d) × x − Σ w·(d × a): two thin matrix products. Cancellation costs about
    1e-16·(length/distance)² near a segment: nearer than 1e-3 lengths take ``field``. A segment contributes nothing
    within 2e-7 of its length from its own axis. ``points`` are (m, 3).
    """
    from scipy.spatial.distance import cdist

    x = np.asarray(points, dtype=np.float64)
    # From the middle of the points, so that the difference of the two products stays small.
    middle = x.mean(axis=0)
    x = x - middle
    start, end = segments.start - middle, segments.end - middle
    d = end - start
    square = np.einsum("ij,ij->i", d, d)
    weighted = (2 * MU0_4PI * segments.share)[:, None] * d
    thin = np.concatenate([weighted, np.cross(weighted, start)], axis=1)
    joined = np.array_equal(start[1:], end[:-1])
    ends = np.concatenate([start, end[-1:]]) if joined else np.concatenate([start, end])
    n = len(start)
    if cutoff:  # the cut-off is a distance in a fourth direction
        x4, ends4 = np.c_[x, np.full(len(x), cutoff)], np.c_[ends, np.zeros(len(ends))]
    else:
        x4, ends4 = x, ends
    rows = max(1, min(32, (1 << 16) // n))
    total = np.empty((len(x), 6))
    far = np.empty((rows, len(ends)))
    s, p = np.empty((rows, n)), np.empty((rows, n))
    for k in range(0, len(x), rows):
        m = min(rows, len(x) - k)
        if m < rows:
            far, s, p = far[:m], s[:m], p[:m]
        cdist(x4[k : k + m], ends4, out=far)
        first, second = (far[:, :-1], far[:, 1:]) if joined else (far[:, :n], far[:, n:])
        np.add(first, second, out=s)
        np.multiply(first, second, out=p)
        gap = s * s
        gap -= square
        np.copyto(gap, np.inf, where=gap <= 1e-13 * square)
        p *= gap
        s /= p
        np.matmul(s, thin, out=total[k : k + m])
    return np.asarray(np.cross(total[:, :3], x) - total[:, 3:])


def force_per_length(
    points: ArrayLike, direction: ArrayLike, segments: Segments, cutoff: float = 0.0, i2: float = 1.0
) -> Array:
    """Force per length (N/m), (..., 3), on a wire that passes ``points`` (..., 3) along ``direction``: t × B."""
    t = np.asarray(direction, dtype=np.float64)
    t = t / np.linalg.norm(t, axis=-1, keepdims=True)
    return np.asarray(i2 * np.cross(t, field(points, segments, cutoff)))


# -- forces ------------------------------------------------------------------------------------------------


def _nodes(segments: Segments, cutoff: float) -> tuple[Array, Array, NDArray[np.intp]]:
    """Points along each segment, their weights (m) and the number of their segment.

    Towards both ends the load changes within the cut-off of a corner: x = c·sinh(v) makes it smooth in v, and the
    Gauss-Legendre rule then converges by a factor of four or more with each node.
    """
    length = np.linalg.norm(segments.end - segments.start, axis=1)
    reach = np.arcsinh(length / (2 * cutoff))
    order = 10 + 5 * np.ceil(reach).astype(int)
    points, weights, owners = [], [], []
    for n in np.unique(order):
        own = np.flatnonzero(order == n)
        v, w = np.polynomial.legendre.leggauss(int(n))
        v = (v + 1) / 2 * reach[own, None]
        x = cutoff * np.sinh(v)
        w = cutoff * np.cosh(v) * w / 2 * reach[own, None]
        unit = (segments.end - segments.start)[own] / length[own, None]
        points.append(segments.start[own, None] + x[..., None] * unit[:, None])
        points.append(segments.end[own, None] - x[..., None] * unit[:, None])
        weights += [w, w]
        owners += [np.repeat(own, n)] * 2
    return (
        np.concatenate([p.reshape(-1, 3) for p in points]),
        np.concatenate([w.ravel() for w in weights]),
        np.concatenate(owners),
    )


def _checked(cutoff: float) -> float:
    if not (math.isfinite(cutoff) and cutoff > 0):
        raise ValueError("the force of a wire on itself needs a cut-off above zero: see cutoffs(radius)")
    return cutoff


def forces(segments: Segments, cutoff: float, i2: float = 1.0, about: ArrayLike = (0.0, 0.0, 0.0)) -> Loads:
    """Force and moment on every segment, from all of them: share·∫ dl × B.

    The sum over a closed wire is zero, and so is that of the moments, to rounding. The integrals along a segment are
    good to about 1e-12 where others come near it only at its ends; where a wire passes or branches off nearer to the
    middle of a segment than a tenth of its length, put a point there.

    Args:
        segments: the circuit; wires that touch must be one wire.
        cutoff: c within a wire (m), above zero.
        i2: square of the common current (A²), or W/R (A²·s).
        about: the point that moments refer to (m).
    """
    p, weight, owner = _nodes(segments, _checked(cutoff))
    same = segments.wire[owner]
    rows = max(1, _BLOCK // (8 * len(segments.start)))
    b = np.empty_like(p)
    for k in range(0, len(p), rows):
        part = slice(k, k + rows)
        c2 = np.where(same[part, None] == segments.wire[None], cutoff**2, 0.0)
        b[part] = _field(p[part], segments, c2)
    d = segments.end - segments.start
    unit = d / np.linalg.norm(d, axis=1)[:, None]
    load = np.cross(unit[owner], b) * (i2 * segments.share[owner] * weight)[:, None]
    moment = np.cross(p - np.asarray(about, dtype=np.float64), load)
    n = len(d)
    return Loads(_gather(load, owner, n), _gather(moment, owner, n))


def midpoint_forces(
    segments: Segments, cutoff: float, i2: float = 1.0, about: ArrayLike = (0.0, 0.0, 0.0)
) -> Loads:
    """``forces`` of one wire with thousands of short segments: the load at the middle of each, by ``field_fast``.

    For segments no longer than the cut-off: along an arc of radius R then within about 0.5 % of ``forces`` at R = 100·c.
    """
    d = segments.end - segments.start
    middle = (segments.start + segments.end) / 2
    load = i2 * segments.share[:, None] * np.cross(d, field_fast(middle, segments, _checked(cutoff)))
    return Loads(load, np.asarray(np.cross(middle - np.asarray(about, dtype=np.float64), load)))


def by_leg(loads: Loads, segments: Segments) -> Loads:
    """Sum the loads of the segments of each leg: row k is leg k."""
    n = int(segments.leg.max()) + 1
    return Loads(_gather(loads.force, segments.leg, n), _gather(loads.moment, segments.leg, n))


def _gather(values: Array, owner: NDArray[np.intp], n: int) -> Array:
    return np.stack([np.bincount(owner, weights=values[:, k], minlength=n) for k in range(3)], axis=1)


def inductance(segments: Segments, cutoff: float) -> float:
    """Inductance (H) of one wire, seen by the common current: (mu0/4π)·∬ dl·dl'/sqrt(|x − x'|² + c²).

    Closed along one segment, ln((R1 + R2 + d)/(R1 + R2 − d)), and integrated along the other as in ``forces``: half of
    its gradient is their force. Each end of a leg adds (mu0/4π)·c to the closed forms of sharp corners, whatever its
    length. For a path that is not closed it is a partial inductance.
    """
    p, weight, owner = _nodes(segments, _checked(cutoff))
    d = segments.end - segments.start
    length = np.linalg.norm(d, axis=1)
    unit = d / length[:, None]
    rows = max(1, _BLOCK // (8 * len(d)))
    total = 0.0
    for k in range(0, len(p), rows):
        part = slice(k, k + rows)
        _, a, b, half = _pairs(p[part], segments, cutoff**2)
        # (s + d)/(s − d) = (s + d)²/(s² − d²), and the lower part is 2·half without cancellation
        inner = np.log((a + b + length) ** 2 / (2 * half)) * (unit[owner[part]] @ unit.T) * segments.share
        total += float((segments.share[owner[part]] * weight[part]) @ inner.sum(axis=1))
    return MU0_4PI * total
