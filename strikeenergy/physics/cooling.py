"""Cooling after the stroke: a body of one temperature in air, in the ground or behind insulation; its expansion.

In still air or wind (no memory, so that time is a quadrature of the temperature)::

    C·V·dT/dt = −A·(h(T)·(T − Ta) + ε·σ·(T⁴ − Ta⁴))

Surrounded by solids (insulation, concrete, soil) the heat diffuses radially; a lumped wire and rings around it are a
linear system, solved exactly in time by its eigenvalues: :class:`Surrounded` gives the response to a unit rise, and
strokes superpose.

Symbols and units: temperatures in K, ``Ta`` of the surroundings, ``d`` diameter, height or radius in m, ``C`` heat capacity
per volume (J/(m³·K)), ``ratio`` volume over cooled surface V/A (m; d/4 for a round wire, half the thickness of a strip),
``h`` heat transfer coefficient (W/(m²·K)), ``k`` thermal conductivity (W/(m·K)), wind in m/s, time in s.

Sources: natural convection: S. W. Churchill, H. H. S. Chu, Int. J. Heat Mass Transfer 18 (1975) 1049 (horizontal cylinder) and
1323 (vertical plate); cross flow: S. W. Churchill, M. Bernstein, J. Heat Transfer 99 (1977) 300; dry air: U.S. Standard
Atmosphere 1976 (conductivity, viscosity, gas constant), heat capacity: M. J. Moran, H. N. Shapiro, Fundamentals of
Engineering Thermodynamics, Table A-21. Cylinder in a medium: H. S. Carslaw, J. C. Jaeger, Conduction of Heat in Solids, 2nd ed.,
13.5. Buckling: S. Timoshenko, J. M. Gere, Theory of Elastic Stability. All from memory, high confidence.

Shapes: arguments are numbers or arrays and broadcast, unless said otherwise.

Valid: bodies that are of one temperature inside (Biot number below 0.1, as for all metal wires in air).
Accuracy: of the quadrature, 4e-4 of the rise.
Memory: a course holds 241 numbers for each body and start; give millions in portions.
Leaves out: rain, sun, altitude other than by ``pressure``, conduction along the wire, latent heat given back on freezing,
drying of the soil, contact resistance between layers; radiation between insulation and air is part of a constant ``h``.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field, replace
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

__all__ = [
    "STEFAN_BOLTZMANN",
    "Air",
    "Layer",
    "Surrounded",
    "after_strokes",
    "air",
    "bow",
    "elongation",
    "fixing_spacing",
    "forced_cylinder",
    "natural_cylinder",
    "natural_plate",
    "restrained_stress",
]

Array = NDArray[np.float64]

STEFAN_BOLTZMANN = 5.670374419e-8
"""W/(m²·K⁴); exact in the SI."""
GRAVITY = 9.80665
_GAS = 287.053
_NODES = 241
_DEEP = np.log(1e-5)


class Properties(NamedTuple):
    """Of dry air: conductivity (W/(m·K)), kinematic viscosity (m²/s), Prandtl number (1)."""

    conductivity: Any
    viscosity: Any
    prandtl: Any


def air(temperature: Any, pressure: Any = 101325.0) -> Properties:
    """Return the properties of dry air at a (film) temperature.

    Valid: 200 to 1000 K; outside, the values at these ends serve.
    """
    t = np.clip(temperature, 200.0, 1000.0)
    k = 2.64638e-3 * t**1.5 / (t + 245.4 * 10 ** (-12 / t))
    mu = 1.458e-6 * t**1.5 / (t + 110.4)
    c = _GAS * (3.653 - 1.337e-3 * t + 3.294e-6 * t**2 - 1.913e-9 * t**3 + 0.2763e-12 * t**4)
    return Properties(k, mu * _GAS * t / pressure, mu * c / k)


def _rayleigh(d: Any, surface: Any, ambient: Any, pressure: Any) -> tuple[Properties, Any]:
    film = (np.asarray(surface) + ambient) / 2
    a = air(film, pressure)
    return a, GRAVITY * np.abs(np.asarray(surface) - ambient) / film * d**3 * a.prandtl / a.viscosity**2


def natural_cylinder(d: Any, surface: Any, ambient: Any, pressure: Any = 101325.0) -> Any:
    """Return h (W/(m²·K)) of a horizontal cylinder of diameter ``d`` in still air. Churchill and Chu; Ra up to 1e12."""
    a, ra = _rayleigh(d, surface, ambient, pressure)
    nu = (0.60 + 0.387 * ra ** (1 / 6) / (1 + (0.559 / a.prandtl) ** (9 / 16)) ** (8 / 27)) ** 2
    return nu * a.conductivity / d


def natural_plate(d: Any, surface: Any, ambient: Any, pressure: Any = 101325.0) -> Any:
    """Return h (W/(m²·K)) of a vertical plate of height ``d`` in still air. Churchill and Chu; every Ra.

    Serves for a vertical wire too; a wire thinner than its boundary layer cools better than this says.
    """
    a, ra = _rayleigh(d, surface, ambient, pressure)
    nu = (0.825 + 0.387 * ra ** (1 / 6) / (1 + (0.492 / a.prandtl) ** (9 / 16)) ** (8 / 27)) ** 2
    return nu * a.conductivity / d


def forced_cylinder(d: Any, surface: Any, ambient: Any, wind: Any, pressure: Any = 101325.0) -> Any:
    """Return h (W/(m²·K)) of a cylinder of diameter ``d`` in cross wind. Churchill and Bernstein; Re·Pr above 0.2."""
    a = air((np.asarray(surface) + ambient) / 2, pressure)
    re = np.asarray(wind) * d / a.viscosity
    nu = 0.3 + (0.62 * np.sqrt(re) * np.cbrt(a.prandtl) / (1 + (0.4 / a.prandtl) ** (2 / 3)) ** 0.25) * (
        1 + (re / 282000) ** (5 / 8)
    ) ** (4 / 5)
    return nu * a.conductivity / d


@dataclass(frozen=True)
class Air:
    """A bare body in air.

    Attributes:
        capacity: C(T) in J/(m³·K): a number, or a function of temperature.
        ratio: volume over cooled surface (m).
        size: diameter of a cylinder or height of a plate (m).
        emissivity: of the surface; the surroundings are black.
        ambient: temperature (K) of air and surroundings.
        wind: across the body (m/s); the greater of natural and forced convection counts. 0 for plates.
        shape: "cylinder" (horizontal) or "plate" (vertical).
        pressure: of the air (Pa).

    All but ``capacity`` and ``shape`` may be arrays that broadcast with the temperatures.
    """

    capacity: float | Callable[[Array], Any]
    ratio: Any
    size: Any
    emissivity: Any
    ambient: Any = 293.15
    wind: Any = 0.0
    shape: str = "cylinder"
    pressure: Any = 101325.0

    def __post_init__(self) -> None:
        if self.shape not in ("cylinder", "plate"):
            raise ValueError(f"the shape is 'cylinder' or 'plate', not {self.shape!r}")
        if self.shape == "plate" and np.any(np.asarray(self.wind) != 0):
            raise ValueError("no law for wind along a plate here: leave it out")
        if not (np.all(np.asarray(self.ratio) > 0) and np.all(np.asarray(self.size) > 0)):
            raise ValueError("the ratio of volume to surface and the size must be positive")

    def _fields(self) -> list[Array]:
        """Return ratio, size, emissivity, ambient, wind and pressure with a last axis for nodes."""
        given = (self.ratio, self.size, self.emissivity, self.ambient, self.wind, self.pressure)
        return [np.asarray(value, dtype=float)[..., None] for value in given]

    def transfer(self, temperature: Any) -> Any:
        """Return the whole coefficient of heat transfer (W/(m²·K)), convection and radiation, at a temperature."""
        return self._transfer(np.asarray(temperature, dtype=float)[..., None])[..., 0]

    def _transfer(self, t: Array) -> Array:
        _, size, emissivity, ambient, wind, pressure = self._fields()
        law = natural_cylinder if self.shape == "cylinder" else natural_plate
        h = law(size, t, ambient, pressure)
        if np.any(wind > 0):
            h = np.where(wind > 0, np.maximum(h, forced_cylinder(size, t, ambient, wind, pressure)), h)
        return np.asarray(h + emissivity * STEFAN_BOLTZMANN * (t**2 + ambient**2) * (t + ambient))

    def _constant(self, t: Array) -> Array:
        capacity = self.capacity(t) if callable(self.capacity) else self.capacity
        return np.asarray(capacity * self._fields()[0] / self._transfer(t))

    def time_constant(self, temperature: Any) -> Any:
        """Return the local time constant C·V/(A·h) in s at a temperature."""
        return self._constant(np.asarray(temperature, dtype=float)[..., None])[..., 0]

    def _course(self, start: Any) -> tuple[Array, Array, Array]:
        """Return excess over the ambient at the start, ln of its decay, and the time at which each decay is reached.

        With y = ln((T − Ta)/(T0 − Ta)) the balance reads dt = −τ(T)·dy: equal steps of y are steps in proportion to
        the time constant, whatever it is, and the quadrature can not become unstable.
        """
        ambient = self._fields()[3]
        excess = np.asarray(start, dtype=float)[..., None] - ambient
        y = np.linspace(0.0, _DEEP, _NODES)
        tau = self._constant(ambient + excess * np.exp(y))
        steps = -np.diff(y) * (tau[..., 1:] + tau[..., :-1]) / 2
        time = np.concatenate([np.zeros((*steps.shape[:-1], 1)), np.cumsum(steps, axis=-1)], axis=-1)
        return np.broadcast_to(excess, (*time.shape[:-1], 1)), y, time

    def after(self, start: Any, time: Any) -> Any:
        """Return the temperature (K) a time (s) after it was ``start``. Shapes broadcast."""
        excess, y, course = self._course(start)
        shape = np.broadcast_shapes(excess.shape[:-1], np.shape(time))
        asked = np.broadcast_to(np.asarray(time, dtype=float), shape).reshape(-1)
        if np.any(asked < 0):
            raise ValueError("a time after the stroke can not be negative")
        rows = course.reshape(-1, _NODES)
        row = np.broadcast_to(np.arange(len(rows)).reshape(course.shape[:-1]), shape).reshape(-1)
        # One bisection for all at once, then a straight line in ln of the excess (carried on beyond the last node).
        low, high = np.zeros(len(row), dtype=np.intp), np.full(len(row), _NODES - 1)
        for _ in range(int(np.ceil(np.log2(_NODES)))):
            middle = (low + high) // 2
            right = rows[row, middle] <= asked
            low, high = np.where(right, middle, low), np.where(right, high, middle)
        part = (asked - rows[row, low]) / (rows[row, low + 1] - rows[row, low])
        decay = np.exp(y[low] + part * (y[1] - y[0])).reshape(shape)
        ambient = np.asarray(self.ambient, dtype=float)
        return ambient + excess[..., 0] * decay

    def history(self, start: Any, times: Any) -> Any:
        """Return temperatures (K) at times (s, one axis), with that axis last: shape of ``start`` plus that of times."""
        names = ("ratio", "size", "emissivity", "ambient", "wind", "pressure")
        fields: dict[str, Any] = {n: np.asarray(getattr(self, n))[..., None] for n in names}
        held = replace(self, **fields)
        return held.after(np.asarray(start, dtype=float)[..., None], np.asarray(times, dtype=float))

    def time_above(self, start: Any, limit: Any) -> Any:
        """Return the time (s) for which it stays above a limit (K): 0 where it never was, infinite where Ta is above."""
        start, limit, ambient = np.broadcast_arrays(
            *(np.asarray(v, dtype=float) for v in (start, limit, self.ambient))
        )
        hot = (start > limit) & (limit > ambient)
        excess = np.where(hot, start - ambient, 1.0)
        depth = np.log(np.where(hot, limit - ambient, 1.0) / excess)
        nodes = np.linspace(0.0, 1.0, _NODES) * depth[..., None]
        tau = self._constant(ambient[..., None] + excess[..., None] * np.exp(nodes))
        time = -np.trapezoid(tau, nodes, axis=-1)
        return np.where(hot, time, np.where((start > limit) & (ambient >= limit), np.inf, 0.0))


@dataclass(frozen=True)
class Layer:
    """A ring around the conductor: outer radius (m; infinite for the last: the ground), conductivity, heat capacity per volume."""

    outer: float
    conductivity: float
    capacity: float


@dataclass(frozen=True)
class Surrounded:
    """A round conductor inside of rings: insulation, concrete, soil.

    Attributes:
        radius: of the conductor (m).
        capacity: heat capacity per volume (J/(m³·K)) of the conductor, constant.
        layers: from the inside out. An infinite last one is taken to where no heat arrives within ``longest``.
        ambient: temperature (K) of the surroundings.
        h: heat transfer (W/(m²·K)), constant, from a finite last layer to the air, radiation included (see Air.transfer).
        longest: time (s) up to which results are wanted.
        rings: how many rings each layer is cut into; the error falls with its square (0.3 % of the rise at most at 60).
    """

    radius: float
    capacity: float
    layers: Sequence[Layer]
    ambient: float = 293.15
    h: float = 10.0
    longest: float = 1e5
    rings: int = 60
    _modes: tuple[Array, Array] = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        from scipy.linalg import eigh_tridiagonal

        bounds, k, c = [self.radius], [np.inf], [self.capacity]
        for n, layer in enumerate(self.layers):
            inner = bounds[-1]
            outer = layer.outer
            if np.isinf(outer) and n == len(self.layers) - 1:
                # 6·sqrt(a·t): erfc(3) of what left the surface has come this far.
                outer = inner + 6 * float(np.sqrt(layer.conductivity / layer.capacity * self.longest))
            if not outer > inner or np.isinf(outer):
                raise ValueError("the radii of the layers must rise, and only the last may be infinite")
            # Rings that widen from a fiftieth of the inner radius: the front of the heat is thin at first.
            first = min((outer - inner) / self.rings, inner / 50)
            grid = _widening(inner, outer, first, self.rings)
            bounds += list(grid[1:])
            k += [layer.conductivity] * self.rings
            c += [layer.capacity] * self.rings
        edges = np.array(bounds)
        volume = np.pi * np.diff(np.concatenate([[0.0], edges]) ** 2)
        heat = np.array(c) * volume
        middle = np.sqrt(edges[1:] * edges[:-1])
        out = np.log(edges[1:] / middle) / (2 * np.pi * np.array(k[1:]))
        into = np.log(middle / edges[:-1]) / (2 * np.pi * np.array(k[1:]))
        # Per metre: conductance from centre to centre; the metal itself has no resistance.
        between = 1 / (into + np.concatenate([[0.0], out[:-1]]))
        last = (
            0.0 if np.isinf(self.layers[-1].outer) else 1 / (out[-1] + 1 / (2 * np.pi * edges[-1] * self.h))
        )
        diagonal = np.concatenate([between, [last]]) + np.concatenate([[0.0], between])
        root = np.sqrt(heat)
        rates, vectors = eigh_tridiagonal(diagonal / heat, -between / (root[1:] * root[:-1]))
        # The excess of the conductor, from a unit excess of itself: a sum of decaying modes.
        object.__setattr__(self, "_modes", (np.maximum(rates, 0.0), vectors[0] ** 2))

    def response(self, time: Any) -> Any:
        """Return the part (1 falling to 0) of a rise that is left a time (s) after it."""
        t = np.asarray(time, dtype=float)
        if np.any(t < 0):
            raise ValueError("a time after the stroke can not be negative")
        rates, weights = self._modes
        return np.exp(-rates * t[..., None]) @ weights

    def history(self, start: Any, times: Any) -> Any:
        """Return temperatures (K) at times (s), that axis last, after the conductor alone was brought to ``start``."""
        return self.ambient + (np.asarray(start, dtype=float)[..., None] - self.ambient) * self.response(
            times
        )

    def time_constant(self) -> float:
        """Return the time (s) after which 1/e of a rise is left."""
        return float(self._time_to(np.exp(-1.0)))

    def time_above(self, start: Any, limit: Any) -> Any:
        """Return the time (s) for which the conductor stays above a limit (K); infinite where longer than ``longest``."""
        start, limit = np.broadcast_arrays(np.asarray(start, dtype=float), np.asarray(limit, dtype=float))
        hot = start > limit
        left = (limit - self.ambient) / np.where(hot, start - self.ambient, 1.0)
        return np.where(hot, self._time_to(np.where(hot, left, 0.5)), 0.0)

    def _time_to(self, left: Any) -> Any:
        times = np.concatenate([[0.0], np.geomspace(1e-7 * self.longest, self.longest, 2000)])
        return np.interp(-np.asarray(left), -self.response(times), times, right=np.inf)


def after_strokes(
    heat: Callable[[Any, Any], Any],
    cool: Air | Surrounded,
    actions: Sequence[Any],
    gaps: Sequence[Any],
    start: Any,
) -> tuple[list[Any], list[Any]]:
    """Return the temperatures (K) before and after each of several strokes, with cooling between them.

    Args:
        heat: temperature after a specific action (A²·s/m⁴), from (temperature before, action).
        cool: how the body cools.
        actions: of the strokes; numbers or arrays.
        gaps: time (s) from each stroke to the next; one fewer than strokes.
        start: temperature (K) before the first.
    """
    if len(gaps) != len(actions) - 1:
        raise ValueError("a time is due between every two strokes")
    before: list[Any] = [np.asarray(start, dtype=float)]
    after: list[Any] = []
    for n, action in enumerate(actions):
        if n and isinstance(cool, Air):
            before.append(cool.after(after[-1], gaps[n - 1]))
        elif n and isinstance(cool, Surrounded):
            # What is left of every earlier rise: the surroundings remember, and superpose.
            since = [sum(np.asarray(g, dtype=float) for g in gaps[m:n]) for m in range(n)]
            left = [(a - b) * cool.response(t) for a, b, t in zip(after, before, since, strict=True)]
            before.append(before[0] + sum(left))
        after.append(np.asarray(heat(before[-1], action)))
    return before, after


def elongation(expansion: Any, rise: Any) -> Any:
    """Return the free elongation (1) of a rise (K) with a mean coefficient of expansion (1/K)."""
    return np.asarray(expansion) * rise


def restrained_stress(modulus: Any, strain: Any, strength: Any = np.inf) -> Any:
    """Return the compressive stress (Pa) of a bar that can not lengthen: E·ε, up to the yield strength (Pa)."""
    return np.minimum(np.asarray(modulus) * np.maximum(strain, 0.0), strength)


def fixing_spacing(gyration: Any, strain: Any, ends: float = 1.0) -> Any:
    """Return the widest distance (m) of fixings at which a bar that can not lengthen stays straight.

    Euler's load, π·i/(K·√ε), with ``gyration`` i the radius of gyration (m; d/4 of a round, t/√12 of a strip) and K
    ``ends``: 1 pinned (safe), 0.5 clamped. The modulus cancels. Infinite where there is no elongation.
    Leaves out: yielding before buckling (short spans), sag, eccentricity.
    """
    strain = np.maximum(np.asarray(strain, dtype=float), 0.0)
    with np.errstate(divide="ignore"):
        return np.pi * np.asarray(gyration) / (ends * np.sqrt(strain))


def bow(span: Any, strain: Any) -> Any:
    """Return the deflection (m) in the middle of a span (m) between fixed points that has buckled into half a sine."""
    return 2 * np.asarray(span) / np.pi * np.sqrt(np.maximum(strain, 0.0))


def _widening(inner: float, outer: float, first: float, count: int) -> Array:
    """Return ``count`` + 1 radii whose intervals grow by one ratio, the first of them ``first`` wide."""
    from scipy.optimize import brentq

    width = (outer - inner) / first
    if width <= count * (1 + 1e-9):
        return np.linspace(inner, outer, count + 1)
    # The widest interval alone, r**(count − 1), must fit: that bounds the ratio.
    ratio = brentq(lambda r: (r**count - 1) / (r - 1) - width, 1 + 1e-9, width ** (1 / (count - 1)) + 1e-9)
    grid = inner + first * np.cumsum(np.concatenate([[0.0], ratio ** np.arange(count)]))
    grid[-1] = outer
    return np.asarray(grid)
