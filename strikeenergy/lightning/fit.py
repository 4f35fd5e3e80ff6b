"""From figures to a waveform: a current that has a given peak, charge, specific energy, front and half-value time.

The targets of a Heidler function are its peak and time scale times functions of a = tau1/tau2 and n alone. In logarithms
the two scales are therefore linear; they are projected out, and only a (and n, where it is free) is searched, in tables
that serve all elements of an array at once (variable projection).

A single Heidler function always has W/R > 0.5·I·Q. Below, the tail needs a second, slower term; above about 0.7·I·Q the
top must be flat. Both have closed forms.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass
from functools import lru_cache
from typing import Any, cast

import numpy as np
from numpy.typing import NDArray

from strikeenergy.errors import InputError, Problem, QuantityError
from strikeenergy.formatting import format_quantity
from strikeenergy.lightning.waveform import (
    Given,
    Heidler,
    LinearFront,
    Sum,
    Trapezoid,
    Waveform,
    lower_point,
    read_parameter,
)
from strikeenergy.physics import pulses
from strikeenergy.units import Quantity

__all__ = ["FitResult", "Mixed", "fit"]

Array = NDArray[np.float64]

# Each target in logarithms: its share of ln(peak) and of ln(time scale); the rest is a function of the shape.
_DESIGN = {
    "peak": (1.0, 0.0),
    "charge": (1.0, 1.0),
    "specific_energy": (2.0, 1.0),
    "front_time": (0.0, 1.0),
    "half_value_time": (0.0, 1.0),
}
_UNITS = {
    "peak": "A",
    "charge": "C",
    "specific_energy": "J/ohm",
    "front_time": "s",
    "half_value_time": "s",
    "duration": "s",
}
_MET = 1e-7
"""Relative residual below which a target counts as met."""
_NEAR = 1e-8  # in logarithms; the tables are good to 1e-10
_WEIGHT = 0.2
_CHUNK = 1024
HEIDLER, FREE, TAIL, FLAT = "Heidler", "Heidler with free n", "impulse plus tail", "flat top"


@dataclass(frozen=True)
class FitResult:
    """A waveform, and how well it has what was asked for."""

    waveform: Waveform
    residuals: Mapping[str, Quantity]
    """Found over asked, minus 1, of each target."""
    method: Any
    """How each waveform was made: a text, or an array of them."""
    assumed: tuple[str, ...]
    """What had to be assumed, because too little was given."""

    @property
    def unmet(self) -> tuple[str, ...]:
        """The targets that are not met (to 1e-7) by every element."""
        return tuple(name for name, value in self.residuals.items() if (np.abs(value) > _MET).any())


@dataclass(frozen=True, init=False, eq=False, repr=False)
class Mixed(Waveform):
    """An array of waveforms of which each element has a kind of its own."""

    parts: tuple[Waveform, ...]
    places: tuple[NDArray[np.intp], ...]
    """Flat index of each element of each part."""
    extent: tuple[int, ...]

    def __init__(self, parts: list[Waveform], places: list[NDArray[np.intp]], shape: tuple[int, ...]) -> None:
        self._set(parts=tuple(parts), places=tuple(places), extent=shape)

    @property
    def shape(self) -> tuple[int, ...]:
        """Shape of the array of waveforms."""
        return self.extent

    def __repr__(self) -> str:
        return f"Mixed({', '.join(f'{len(i)} times {p!r}' for p, i in zip(self.parts, self.places, strict=True))})"

    def __eq__(self, other: object) -> bool:
        if not isinstance(other, Mixed) or self.extent != other.extent or self.parts != other.parts:
            return False
        return all(np.array_equal(a, b) for a, b in zip(self.places, other.places, strict=True))

    __hash__ = Waveform.__hash__

    def _select(self, pick: Callable[[Any], Any], shape: tuple[int, ...]) -> Any:
        order = np.broadcast_to(np.arange(int(np.prod(self.extent))).reshape(self.extent), shape)
        wanted = np.asarray(pick(order))
        parts, places = [], []
        for part, place in zip(self.parts, self.places, strict=True):
            at = np.flatnonzero(np.isin(wanted.ravel(), place))
            if at.size:
                parts.append(part[np.searchsorted(place, wanted.ravel()[at])])
                places.append(at)
        return parts[0][0] if not wanted.ndim else Mixed(parts, places, wanted.shape)

    def _each(self, f: Callable[..., Any], t: Any = 0.0) -> Any:
        """Call f(part, its times) for each part and put the results in their places."""
        whole = np.broadcast_shapes(np.shape(t), self.extent)
        times = np.broadcast_to(t, whole).reshape(-1, int(np.prod(self.extent)))
        out = np.empty(times.shape)
        for part, place in zip(self.parts, self.places, strict=True):
            out[:, place] = f(part, times[:, place])
        return out.reshape(whole)

    def current(self, t: Quantity) -> Quantity:
        """Current at the time t (A)."""
        return cast(Quantity, self._each(lambda part, s: part.current(s), t))

    def slope(self, t: Quantity) -> Quantity:
        """Derivative of the current at the time t (A/s)."""
        return cast(Quantity, self._each(lambda part, s: part.slope(s), t))

    def charge_until(self, t: Quantity) -> Quantity:
        """Charge up to the time t (C)."""
        return cast(Quantity, self._each(lambda part, s: part.charge_until(s), t))

    @property
    def charge(self) -> Quantity:
        """∫ i dt (C)."""
        return cast(Quantity, self._each(lambda part, _: part.charge))

    @property
    def specific_energy(self) -> Quantity:
        """∫ i² dt = W/R (J/ohm)."""
        return cast(Quantity, self._each(lambda part, _: part.specific_energy))

    def _knots(self) -> Array:
        knots = [part._knots() for part in self.parts]
        out = np.empty((max(len(k) for k in knots), int(np.prod(self.extent))))
        for rows, place in zip(knots, self.places, strict=True):
            out[: len(rows), place] = rows
            out[len(rows) :, place] = rows[-1]
        return out.reshape(-1, *self.extent)

    def _crest_time(self) -> Any:
        return self._each(lambda part, _: part.peak_time)

    def _steepest(self) -> Any:
        return self._each(lambda part, _: part.steepest_time)

    def _cross(self, level: float, side: int) -> Any:
        return self._each(lambda part, _: part._rise(level) if side < 0 else part._fall(level))


# -- Heidler: tables and search ----------------------------------------------------------------------------

_LOW = -16.0  # ln(a/n) from here to 0
_NODES = 3001
_MOST_N = 120.0


def _shape_logs(log_a: Any, n: Any, names: Iterable[str], definition: str) -> Array:
    """ln of the named figures of the Heidler function with unit peak and tau2 = 1; last axis."""
    w = Heidler(np.ones(np.shape(log_a)), np.exp(log_a), 1.0, n)
    return cast(Array, np.log(np.stack([_figure(w, name, definition) for name in names], axis=-1)))


def _figure(w: Waveform, name: str, definition: str) -> Any:
    return getattr(w, name)(definition) if name.endswith("time") else getattr(w, name)


@lru_cache(maxsize=16)
def _line(n: float, definition: str) -> tuple[Array, Array]:
    """Nodes in ln a, and the figures there, for one n."""
    log_a = np.linspace(_LOW, -1e-9, _NODES) + np.log(n)
    return log_a, _shape_logs(log_a, n, _DESIGN, definition)


@lru_cache(maxsize=4)
def _plane(definition: str) -> tuple[Array, Array, Array]:
    """Nodes in ln(a/n) and ln n, and the figures there."""
    ratio, log_n = np.linspace(_LOW, -1e-9, 241), np.linspace(0.0, np.log(_MOST_N), 61)
    grid_n = np.exp(np.broadcast_to(log_n, (ratio.size, log_n.size)))
    return ratio, log_n, _shape_logs(ratio[:, None] + np.log(grid_n), grid_n, _DESIGN, definition)


@dataclass(frozen=True, eq=False)
class _Projection:
    """The two directions that the scales of peak and time cannot reach, and those that they can."""

    names: tuple[str, ...]
    columns: list[int]
    rest: Array
    scales: Array

    def split(self, logs: Array) -> tuple[Array, Array]:
        """Return what must vanish, and ln(peak), ln(time scale)."""
        return logs @ self.rest, logs @ self.scales


@lru_cache(maxsize=64)
def _projection(names: tuple[str, ...]) -> _Projection:
    design = np.array([_DESIGN[name] for name in names])
    left, _, _ = np.linalg.svd(design)
    return _Projection(names, [list(_DESIGN).index(n) for n in names], left[:, 2:], np.linalg.pinv(design).T)


@lru_cache(maxsize=16)
def _line_table(projection: _Projection, n: float, definition: str) -> tuple[Array, Array, Array]:
    """Nodes in ln a, what must vanish there, and the coefficients of its cubic spline."""
    from scipy.interpolate import CubicSpline

    nodes, logs = _line(n, definition)
    table = projection.split(logs[:, projection.columns])[0]
    # (interval, power, direction), highest power first: one gather serves value and derivatives.
    return nodes, table, np.ascontiguousarray(CubicSpline(nodes, table).c.swapaxes(0, 1))


@lru_cache(maxsize=16)
def _plane_table(projection: _Projection, definition: str) -> tuple[Array, Array, Array, list[Any]]:
    """Nodes in ln(a/n) and ln n, what must vanish there, and its splines."""
    from scipy.interpolate import RectBivariateSpline

    ratio, log_n, logs = _plane(definition)
    table = projection.split(logs[..., projection.columns])[0]
    splines = [RectBivariateSpline(ratio, log_n, table[..., k], kx=5, ky=5) for k in range(table.shape[-1])]
    return ratio, log_n, table, splines


def _search_line(target: Array, projection: _Projection, n: float, definition: str) -> Array:
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


def _search_plane(target: Array, projection: _Projection, definition: str) -> tuple[Array, Array]:
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


Fitted = tuple[Waveform, Array]
"""A waveform, and ln(found/asked) of each target."""


def _heidler(target: Array, projection: _Projection, log_a: Array, n: Any, definition: str) -> Fitted:
    """Add the two scales to a shape."""
    logs = np.broadcast_to(_shape_logs(log_a, n, projection.names, definition), target.shape)
    scales = projection.split(target - logs)[1]
    peak, scale = np.exp(scales).T
    design = np.array([_DESIGN[name] for name in projection.names])
    return Heidler(peak, np.exp(log_a) * scale, scale, n), logs + scales @ design.T - target


# -- closed forms ------------------------------------------------------------------------------------------


def _measured(w: Waveform, target: Array, names: tuple[str, ...], definition: str) -> Fitted:
    return w, np.log(np.stack([_figure(w, name, definition) for name in names], axis=-1)) - target


def _two_tails(q: Array, e: Array, w: Array) -> tuple[Array, Array]:
    """Time constants of (1 − w)·e^(−t/τa) + w·e^(−t/τb) with the integral q and the integral of the square e.

    e/q depends on u = τb/τa alone and falls from 1/2 at u = 1 to w/2; the condition is a quadratic in u, with one root
    above 1.
    """
    r = e / q
    c2, c0 = w * (w / 2 - r), (1 - w) * ((1 - w) / 2 - r)
    c1 = ((1 - w) ** 2 + w**2) / 2 + 2 * w * (1 - w) - r
    u = np.maximum((-c1 - np.sqrt(np.maximum(c1**2 - 4 * c2 * c0, 0))) / (2 * c2), 1.0)
    fast = q / (1 - w + w * u)
    return fast, u * fast


def _impulse_and_tail(known: dict[str, Array], weight: float) -> Sum:
    """Straight front and two exponentials: exact in peak, charge, specific energy and front time.

    The share of the slow tail cannot be told from these; it is ``weight`` unless a half-value time is to be met.
    """
    peak, front = known["peak"], known.get("front_time", np.zeros_like(known["peak"]))
    q, e = known["charge"] / peak - front / 2, known["specific_energy"] / peak**2 - front / 3
    top = np.minimum(2 * e / q, 1.0)  # the share must stay below it
    share = np.minimum(weight, top / 2)
    if "half_value_time" in known:
        wanted = known["half_value_time"] - front

        def late(w: Array) -> Array:
            """ln of the current at the wanted half-value time, over one half."""
            fast, slow = _two_tails(q, e, w)
            return np.log(2 * ((1 - w) * np.exp(-wanted / fast) + w * np.exp(-wanted / slow)))

        tries = top * np.linspace(0.005, 0.995, 50)[:, None]
        values = late(tries)
        change = np.signbit(values[1:]) != np.signbit(values[:-1])
        at = np.where(change.any(axis=0), change.argmax(axis=0), 0)
        low, high = (np.take_along_axis(tries, (at + i)[None], axis=0)[0] for i in (0, 1))
        nearest = np.take_along_axis(tries, np.abs(values).argmin(axis=0)[None], axis=0)[0]
        share = np.where(change.any(axis=0), pulses.find_root(late, low, high), nearest)
    fast, slow = _two_tails(q, e, share)
    return LinearFront(peak * (1 - share), front, fast) + LinearFront(peak * share, front, slow)


def _flat_top(known: dict[str, Array]) -> Trapezoid:
    """Straight front, flat top, straight fall: exact in peak, charge and specific energy, and in the front time.

    Q/I = top + (front + fall)/2 and (W/R)/I² = top + (front + fall)/3.
    """
    peak = known["peak"]
    q, e = known["charge"] / peak, known["specific_energy"] / peak**2
    edges = np.maximum(6 * (q - e), 0.0)
    front = np.minimum(known["front_time"], edges) if "front_time" in known else edges / 2
    return Trapezoid(peak, front, np.maximum(3 * e - 2 * q, 0.0) + edges, edges - front)


# -- the one door ------------------------------------------------------------------------------------------


def _read(given: Mapping[str, Given], low: float) -> dict[str, Quantity]:
    """Read and check what was given; refuse what no current can have."""
    values, problems = {}, []
    for name, value in given.items():
        try:
            if value is not None:
                values[name] = read_parameter(value, _UNITS[name])
        except QuantityError as error:
            problems.append(Problem(error.what, error.write, (name,)))
    try:
        np.broadcast_shapes(*(np.shape(v) for v in values.values()))
    except ValueError:
        problems.append(
            Problem("the shapes of the targets do not fit together", "give arrays that broadcast")
        )
    if not problems:
        problems += [
            Problem(
                f"no current can have this: {bound} does not hold{_where(broken, values)}", write, (names[0],)
            )
            for names, bound, holds, write in (*_BOUNDS, *_front_bounds(low))
            if values.keys() >= set(names)
            and (broken := ~np.asarray(holds(*(values[n] for n in names)))).any()
        ]
    if problems:
        raise InputError(problems)
    return values


_SLACK = 1 + 1e-9
Bound = tuple[tuple[str, ...], str, Callable[..., Any], str]
_BOUNDS: tuple[Bound, ...] = (
    (
        ("specific_energy", "peak", "charge"),
        "W/R <= I*Q",
        lambda w, i, q: w <= i * q * _SLACK,
        "the current would have to exceed its peak; check that all three are of one stroke",
    ),
    (
        ("specific_energy", "charge", "duration"),
        "Q^2/T <= W/R",
        lambda w, q, t: q**2 <= w * t * _SLACK,
        "a constant current has the least; write a longer duration or a larger specific energy",
    ),
    (
        ("charge", "peak", "duration"),
        "Q <= I*T",
        lambda q, i, t: q <= i * t * _SLACK,
        "write a longer duration",
    ),
)


def _front_bounds(low: float) -> tuple[Bound, Bound]:
    """From its lower point on, the front lasts (0.9 − low)·T1, and the current stays above ``low`` of the peak."""
    c1, c2 = low * (0.9 - low), low**2 * (0.9 - low)
    write = "write a shorter front time"
    return (
        (
            ("front_time", "peak", "charge"),
            f"{c1:.2g}*I*T1 <= Q",
            lambda t, i, q: c1 * i * t <= q * _SLACK,
            write,
        ),
        (
            ("front_time", "peak", "specific_energy"),
            f"{c2:.2g}*I^2*T1 <= W/R",
            lambda t, i, w: c2 * i**2 * t <= w * _SLACK,
            write,
        ),
    )


def _where(broken: NDArray[np.bool_], values: Mapping[str, Quantity]) -> str:
    if broken.ndim:
        return f" for {int(broken.sum())} of {broken.size} elements"
    shown = (f"{name} {format_quantity(float(value), _UNITS[name])}" for name, value in values.items())
    return f" ({', '.join(shown)})"


def fit(
    *,
    peak: Given = None,
    charge: Given = None,
    specific_energy: Given = None,
    front_time: Given = None,
    half_value_time: Given = None,
    duration: Given = None,
    n: Given = None,
    weight: Given = _WEIGHT,
    definition: str = "10/90",
) -> FitResult:
    """Find a waveform that has what is given; each target a number (SI), an array or a text with a unit.

    Two targets leave the shape open: that of 10/350 is assumed, and said. With three the front exponent n is 10, with more
    it is found, so that up to four can be met exactly; five are met in the least-squares sense of relative residuals.
    Where no Heidler function has them, an impulse with a second, slower tail (W/R below 0.5·I·Q) or a flat-topped current
    (above about 0.7·I·Q) takes its place, if that comes nearer.

    Args:
        peak: (A).
        charge: (C).
        specific_energy: (J/ohm).
        front_time: T1 (s).
        half_value_time: T2 (s).
        duration: whole duration (s); it is only checked against the bounds.
        n: fix the exponent: then a Heidler function is fitted by least squares, and nothing else.
        weight: share of the slow tail in the peak, which three figures do not determine.
        definition: of T1 and T2.

    Raises:
        InputError: what no current can have (naming the bound), or too little to go by.
    """
    given = {"peak": peak, "charge": charge, "specific_energy": specific_energy, "front_time": front_time}
    given |= {"half_value_time": half_value_time, "duration": duration}
    values = _read(given, lower_point(definition))
    weight, n = read_parameter(weight, "1"), None if n is None else read_parameter(n, "1")
    if np.ndim(weight) or np.ndim(n) or not 0 < weight < 1 or not (n is None or 1 <= n <= _MOST_N):
        raise InputError([Problem("weight must be between 0 and 1, n between 1 and 120", "leave them out")])
    names = tuple(name for name in _DESIGN if name in values)
    if np.linalg.matrix_rank(np.array([_DESIGN[name] for name in names]).reshape(-1, 2)) < 2:
        have = " and ".join(names) or "nothing"
        write = "give at least two, one of which has the current in it (peak, charge or specific energy)"
        raise InputError([Problem(f"{have} fixes no waveform", write)])
    shape = np.broadcast_shapes(*(np.shape(v) for v in values.values()))
    known = {name: np.broadcast_to(values[name], shape).ravel().astype(float) for name in names}
    return _Fit(names, known, shape, definition).run(n, weight)


class _Fit:
    """One call of ``fit``: the elements in a row, and the best waveform found for each so far."""

    def __init__(
        self, names: tuple[str, ...], known: dict[str, Array], shape: tuple[int, ...], definition: str
    ) -> None:
        self.names, self.known, self.shape, self.definition = names, known, shape, definition
        self.target = np.log(np.stack([known[name] for name in names], axis=-1))
        self.off = np.zeros_like(self.target)
        self.method = np.full(len(self.target), HEIDLER, dtype=object)
        self.found: dict[str, tuple[Waveform, NDArray[np.intp]]] = {}

    @property
    def left(self) -> Array:
        """Largest residual of each element."""
        return cast(Array, np.abs(self.off).max(axis=1, initial=0.0))

    def _offer(self, method: str, where: NDArray[np.intp], made: Fitted) -> None:
        """Take over the waveforms of one method for the elements that they suit better."""
        waveform, off = made
        better = np.abs(off).max(axis=1) < self.left[where]
        if better.any():
            self.method[where[better]], self.off[where[better]] = method, off[better]
            self.found[method] = (waveform[better], where[better])

    def run(self, n: Any, weight: Any) -> FitResult:
        projection, fixed = _projection(self.names), 10.0 if n is None else float(n)
        everything = np.arange(len(self.target))
        if len(self.names) == 2:
            pattern = Heidler.from_times(1.0, 10e-6, 350e-6, fixed)
            log_a = np.full(everything.size, np.log(pattern.tau1 / pattern.tau2))
        else:
            log_a = _search_line(self.target, projection, fixed, self.definition)
        waveform, self.off = _heidler(self.target, projection, log_a, fixed, self.definition)
        self.found[HEIDLER] = (waveform, everything)
        if n is None and len(self.names) > 2:
            self._try_others(projection, weight)
        assumed = ("the shape of 10/350",) if len(self.names) == 2 else ()
        residuals = {
            name: np.expm1(self.off[:, j]).reshape(self.shape)[()] for j, name in enumerate(self.names)
        }
        methods = list(dict.fromkeys(self.method))
        method = methods[0] if len(methods) == 1 else self.method.astype(str).reshape(self.shape)
        return FitResult(self._assemble(methods), residuals, method, assumed)

    def _try_others(self, projection: _Projection, weight: float) -> None:
        known, target, names, definition = self.known, self.target, self.names, self.definition
        triple = {"peak", "charge", "specific_energy"} <= known.keys()
        rho = (
            known["specific_energy"] / (known["peak"] * known["charge"])
            if triple
            else np.full(len(target), 0.6)
        )
        where = np.flatnonzero((self.left > _NEAR) & (rho > 0.5) & (rho < 0.72))
        if where.size:
            log_a, free_n = _search_plane(target[where], projection, definition)
            self._offer(FREE, where, _heidler(target[where], projection, log_a, free_n, definition))
        if not triple:
            return
        front = known.get("front_time", np.zeros(len(target)))
        q, e = (
            known["charge"] / known["peak"] - front / 2,
            known["specific_energy"] / known["peak"] ** 2 - front / 3,
        )
        unmet = self.left > _NEAR
        for method, possible in ((TAIL, (e > 0) & (e <= q / 2 * _SLACK)), (FLAT, rho >= 2 / 3 / _SLACK)):
            where = np.flatnonzero(unmet & possible)
            if where.size:
                some = {name: value[where] for name, value in known.items()}
                made = _impulse_and_tail(some, weight) if method == TAIL else _flat_top(some)
                self._offer(method, where, _measured(made, target[where], names, definition))

    def _assemble(self, methods: list[str]) -> Waveform:
        parts, places = [], []
        for method in methods:
            waveform, where = self.found[method]
            mine = self.method[where] == method
            parts.append(waveform if mine.all() else waveform[mine])
            places.append(where[mine])
        if len(parts) > 1:
            return Mixed(parts, places, self.shape)
        return parts[0]._select(lambda values: values.reshape(self.shape)[()], (len(self.target),))
