"""Specific action: Joule heating through every phase of a metal, with properties that change with temperature.

A current density j heats a metal, with no heat lost, by ``dH = ρ(T)·j²·dt``. What the current has to deliver for a given
heat content is therefore a property of the metal alone::

    G = ∫ j² dt = ∫ dH/ρ(T)                      specific action, A²·s/m⁴ (10¹² of them are 1 A²·s/mm⁴)
    H(T) = ∫ C(T) dT, plus latent heats          enthalpy per volume, J/m³

At a plateau T stands still while the fraction f that has changed runs from 0 to 1. The two phases share the current as
if they lay in series along its path (ρ = ρs + f·(ρl − ρs)), so that melting takes exactly
``γ·L·ln(ρl/ρs)/(ρl − ρs)``. At boiling the vapour carries no current and the liquid that is left carries it all
(ρ = ρl/(1 − f)), so that a full vaporisation takes ``γ·L/(2·ρl)``: real wires burst somewhere on that plateau.

Layers in parallel (a coating on a core) share one temperature: their conductances and their heat capacities add.
G then refers to the current over the *whole* section. A molten coating is taken to stay where it is.

Symbols and units: temperature (K), heat capacity per volume C = γ·c (J/(m³·K)) with γ at the reference state, latent
heat per volume (J/m³), resistivity (ohm·m), ``w`` specific energy W/R (J/ohm), ``q`` section (m²): G = w/q².

Source: H. Knoepfel, Pulsed High Magnetic Fields (1970), current integral; the fraction laws are elementary integrals.

Shapes: arguments of the methods are numbers or arrays; they broadcast. Between its nodes a table is linear in T, H and G;
there is a node at every corner, and no interval spans one.

Valid: sections that the current fills, pulses too short for heat to leave.
Leaves out: skin effect, heat loss, thermal expansion (γ and the section stay those of the reference state), superheating,
magnetic pressure, liquid that drops off, the heat that a vapour takes up. Where the data end, results are NaN.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from itertools import pairwise
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from strikeenergy.errors import OutsideValidity

__all__ = ["STATES", "Heating", "Metal", "Phase", "Plateau", "heating_table", "melting_action"]

Array = NDArray[np.float64]
Kind = Literal["transition", "melting", "vaporisation"]

_CHUNK = 16384

STATES = ("solid", "melting", "molten", "vaporised")
"""Words for the codes 0 to 3. "vaporised": the boiling plateau has been entered; the fraction says how far."""

# Four-point Gauss-Legendre rule on 0..1: exact for straight lines and their products, near enough for 1/ρ in a cell.
_GAUSS_X, _GAUSS_W = np.array([[1.0], [0.0]]) / 2 + np.array(np.polynomial.legendre.leggauss(4)) / 2


@dataclass(frozen=True)
class Phase:
    """One phase: node temperatures (K, rising), heat capacity per volume and resistivity there; straight lines between."""

    temperature: Array
    heat: Array
    resistivity: Array


@dataclass(frozen=True)
class Metal:
    """The phases of one metal from cold to hot, and what lies between them.

    Attributes:
        phases: each begins at the temperature at which the one before it ends.
        changes: kind and latent heat per volume (J/m³) between one phase and the next; one fewer than phases.
        last: the change at the end of the last phase, or None where the data simply end. "vaporisation" completes them;
            after a "melting" without data of the liquid there is a gap, and the plateau keeps the solid's resistivity.
    """

    phases: tuple[Phase, ...]
    changes: tuple[tuple[Kind, float], ...] = ()
    last: tuple[Kind, float] | None = None

    @property
    def complete(self) -> bool:
        """Whether the data reach to full vaporisation."""
        return self.last is not None and self.last[0] == "vaporisation"

    def __post_init__(self) -> None:
        if len(self.changes) != len(self.phases) - 1:
            raise ValueError("a change is due between every two phases")
        for phase in self.phases:
            steps = np.diff(phase.temperature)
            if (
                len(steps) < 1
                or np.any(steps <= 0)
                or np.any(phase.heat <= 0)
                or np.any(phase.resistivity <= 0)
            ):
                raise ValueError(
                    "a phase needs rising temperatures, positive heat capacities and resistivities"
                )
        for below, above in zip(self.phases, self.phases[1:], strict=False):
            if below.temperature[-1] != above.temperature[0]:
                raise ValueError("a phase must begin where the one before it ends")


@dataclass(frozen=True)
class Plateau:
    """A temperature at which one layer changes its phase.

    ``others`` is the conductivity of the other layers times their share (S/m), ``share`` that of this layer in the section,
    ``latent`` its latent heat per volume of itself (J/m³), ``before`` and ``after`` its resistivities.
    """

    kind: Kind
    layer: int
    temperature: float
    latent: float
    before: float
    after: float
    share: float
    others: float
    start: float = 0.0
    """Specific action at which it begins."""

    def action(self, fraction: Any) -> Any:
        """Return the specific action (A²·s/m⁴) from the beginning of the plateau to a changed fraction."""
        if self.kind == "vaporisation":
            own = (fraction - fraction**2 / 2) / self.before
        else:
            rise = (self.after - self.before) / self.before
            # log1p(x)/x runs smoothly through x = 0, where the two resistivities are the same.
            x = rise * fraction
            with np.errstate(invalid="ignore", divide="ignore"):
                ratio = np.where(np.abs(x) > 1e-9, np.log1p(x) / np.where(x == 0, 1, x), 1 - x / 2)
            own = fraction * ratio / self.before
        return self.share * self.latent * (self.others * fraction + self.share * own)

    @property
    def end(self) -> float:
        """Specific action at which it ends."""
        return self.start + float(self.action(1.0))

    def fraction(self, action: Any) -> Array:
        """Return the changed fraction (0 to 1) at a specific action counted from that of the table."""
        given = np.clip((np.asarray(action, dtype=float) - self.start) / (self.end - self.start), 0.0, 1.0)
        # Rounding must not leave a trace of the old phase beyond the end.
        return np.where((given > 0) & (given < 1), self._inverse(given), given)

    def _inverse(self, given: Array) -> Array:
        """Return the changed fraction at a part of the plateau's action."""
        target = given * float(self.action(1.0))
        vapour, rise = self.kind == "vaporisation", self.after - self.before
        if self.others == 0:
            g = target / (self.share**2 * self.latent) * self.before
            if vapour:
                return np.asarray(1 - np.sqrt(np.maximum(1 - 2 * g, 0)))
            x = rise / self.before
            return np.asarray(np.expm1(x * g) / x if abs(x) > 1e-9 else g)
        # With other layers in parallel the law has no inverse in closed form: start from a table, then Newton.
        knots = np.linspace(0, 1, 65)
        f = np.interp(target, self.action(knots), knots)
        for _ in range(3):
            own = (1 - f) / self.before if vapour else 1 / (self.before + f * rise)
            slope = self.share * self.latent * (self.others + self.share * own)
            f = np.clip(f - (self.action(f) - target) / slope, 0, 1)
        return np.asarray(f)


@dataclass(frozen=True)
class Heating:
    """T, H and G of one metal, or of layers in parallel, tabulated with nodes on every corner.

    Attributes:
        temperature: of the nodes (K); repeats over a plateau.
        enthalpy: per volume (J/m³) above that of the first node.
        action: specific action (A²·s/m⁴) from the first node; strictly rising.
        plateaus: from cold to hot.
        complete: whether the table ends with everything vaporised, not with a gap in the data.
    """

    temperature: Array
    enthalpy: Array
    action: Array
    plateaus: tuple[Plateau, ...]
    complete: bool
    _first: NDArray[np.intp] = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        for nodes in (self.temperature, self.enthalpy, self.action):
            nodes.flags.writeable = False
        # So many equal bins that none holds two nodes; one to spare, as rounding may shift a value by one bin.
        bins = 2 * self.action[-1] / np.diff(self.action).min()
        edges = np.arange(int(bins) if bins < 2**16 else 0) * (self.action[-1] / max(int(bins), 1))
        first = np.searchsorted(self.action, edges * (1 - 1e-12), side="right") - 1
        object.__setattr__(self, "_first", np.clip(first, 0, len(self.action) - 2))

    def _cell(self, temperature: Any) -> tuple[Any, Any]:
        t = np.asarray(temperature, dtype=float)
        lowest, highest = self.temperature[0], self.temperature[-1]
        if np.any(t < lowest) or np.any(t > highest) or np.any(np.isnan(t)):
            raise OutsideValidity(f"the data run from {lowest:.2f} K to {highest:.2f} K, and no further")
        # Left: the beginning of a plateau, so that a start at the melting point is solid.
        i = np.clip(np.searchsorted(self.temperature, t, side="left"), 1, len(self.temperature) - 1)
        return i, (t - self.temperature[i - 1]) / (self.temperature[i] - self.temperature[i - 1])

    def action_at(self, temperature: Any) -> Any:
        """Return the specific action (A²·s/m⁴) of a temperature (K); on a plateau, that of its beginning."""
        i, part = self._cell(temperature)
        return self.action[i - 1] + part * (self.action[i] - self.action[i - 1])

    def enthalpy_at(self, temperature: Any) -> Any:
        """Return the enthalpy per volume (J/m³) of a temperature (K); on a plateau, that of its beginning."""
        i, part = self._cell(temperature)
        return self.enthalpy[i - 1] + part * (self.enthalpy[i] - self.enthalpy[i - 1])

    def reached(self, w: Any, q: Any, start: Any = 293.15) -> Any:
        """Return the specific action at which a specific energy ``w`` through a section ``q`` leaves metal of ``start`` (K)."""
        return self.action_at(start) + np.asarray(w) / np.asarray(q) ** 2

    def temperature_at(self, action: Any) -> Any:
        """Return the temperature (K) of a specific action: the inverse of G. NaN beyond a gap in the data.

        Beyond full vaporisation it stays at the boiling point: the state, not this number, is the result there.
        """
        g = np.asarray(action, dtype=float)
        if g.size < 4 * _CHUNK or not self._first.size:
            return np.interp(g, self.action, self.temperature, right=None if self.complete else np.nan)
        # The same lines, six times as fast: equal bins, of one node at most, say where a line begins; no bisection.
        flat, found, top = g.reshape(-1), np.empty(g.size), self.action[-1]
        slope = np.diff(self.temperature) / np.diff(self.action)
        base = self.temperature[:-1] - slope * self.action[:-1]
        for at in range(0, g.size, _CHUNK):
            x = np.clip(flat[at : at + _CHUNK], 0.0, top)
            with np.errstate(invalid="ignore"):  # the bin of a NaN: any, its line gives NaN
                i = self._first.take((x * (len(self._first) / top)).astype(np.intp), mode="clip")
            i = np.minimum(i + (x >= self.action.take(i + 1)), len(slope) - 1)
            found[at : at + _CHUNK] = slope.take(i) * x + base.take(i)
        if not self.complete:
            found[flat > top] = np.nan
        return found.reshape(g.shape)

    def enthalpy_of(self, action: Any) -> Any:
        """Return the enthalpy per volume (J/m³) of a specific action, exact over plateaus. NaN beyond a gap in the data."""
        g = np.asarray(action, dtype=float)
        h = np.interp(g, self.action, self.enthalpy, right=None if self.complete else np.nan)
        for p in self.plateaus:
            # The share times the latent heat, wherever the straight line of the table stood for it.
            on = (g > p.start) & (g < p.end)
            if np.any(on):
                below = self.enthalpy[np.searchsorted(self.action, p.start)]
                h = np.where(on, below + p.share * p.latent * p.fraction(g), h)
        return h

    def of(self, kind: Kind, layer: int = 0) -> Plateau | None:
        """Return the plateau of this kind of a layer, or None where the data do not reach it."""
        return next((p for p in self.plateaus if p.kind == kind and p.layer == layer), None)

    def melted_fraction(self, action: Any, layer: int = 0) -> Any:
        """Return the melted fraction (0 to 1) of a layer at a specific action. NaN beyond a gap in the data."""
        return self._fraction("melting", action, layer)

    def vaporised_fraction(self, action: Any, layer: int = 0) -> Any:
        """Return the vaporised fraction (0 to 1) of a layer at a specific action. NaN beyond a gap in the data."""
        return self._fraction("vaporisation", action, layer)

    def _fraction(self, kind: Kind, action: Any, layer: int) -> Any:
        g = np.asarray(action, dtype=float)
        plateau = self.of(kind, layer)
        f = plateau.fraction(g) if plateau else np.zeros(g.shape)
        return np.where(self._unknown(g), np.nan, f)

    def state(self, action: Any, layer: int = 0) -> NDArray[np.int8]:
        """Return the state of a layer as an index of STATES; −1 beyond a gap in the data, or of NaN."""
        g = np.asarray(action, dtype=float)
        code = np.zeros(g.shape, dtype=np.int8)
        melting, boiling = self.of("melting", layer), self.of("vaporisation", layer)
        if melting:
            code = np.where(g > melting.start, np.int8(1), code)
            code = np.where(g >= melting.end, np.int8(2), code)
        if boiling:
            code = np.where(g > boiling.start, np.int8(3), code)
        return np.where(self._unknown(g), np.int8(-1), code)

    def _unknown(self, g: Array) -> NDArray[np.bool_]:
        return np.isnan(g) if self.complete else np.isnan(g) | (g > self.action[-1])


def melting_action(latent: Any, solid: Any, liquid: Any) -> Any:
    """Return the specific action (A²·s/m⁴) of melting: γ·L·ln(ρl/ρs)/(ρl − ρs), which is γ·L/ρs where the two are equal.

    Args:
        latent: heat of melting per volume (J/m³).
        solid, liquid: resistivities at the melting point (ohm·m).
    """
    ratio = np.asarray(liquid, dtype=float) / solid - 1
    near = np.abs(ratio) < 1e-9
    return latent / solid * np.where(near, 1 - ratio / 2, np.log1p(ratio) / np.where(near, 1, ratio))


def heating_table(metals: Metal | Sequence[tuple[float, Metal]], step: float = 1.0) -> Heating:
    """Tabulate T, H and G of a metal, or of layers in parallel.

    Args:
        metals: one metal, or pairs of a layer's share of the section (they must add up to 1) and its metal.
        step: widest interval between nodes (K). Linear interpolation errs by about step²/(8·T): 0.4 mK for 1 K.

    Returns:
        The table, from the highest first temperature of the layers to where the data of one of them end (a layer that
        has boiled away leaves the current to the others).

    Raises:
        ValueError: the shares do not add up to 1, or the layers have no temperature in common.
    """
    layers = [(1.0, metals)] if isinstance(metals, Metal) else [(float(a), m) for a, m in metals]
    if any(a <= 0 for a, _ in layers) or abs(sum(a for a, _ in layers) - 1) > 1e-9:
        raise ValueError("the shares of the layers must be positive and add up to 1")
    begin = max(m.phases[0].temperature[0] for _, m in layers)
    ends = [float(m.phases[-1].temperature[-1]) for _, m in layers]
    gaps = [end for end, (_, m) in zip(ends, layers, strict=True) if not m.complete]
    finish = min([max(ends), *gaps])
    if min(finish, *ends) <= begin:
        raise ValueError("the data of the layers have no temperature in common")
    corners = {begin, finish}
    for _, m in layers:
        for p in m.phases:
            corners |= {float(t) for t in (p.temperature[0], p.temperature[-1]) if begin < t < finish}
    stops = sorted(corners)

    t, h, g = [np.array([begin])], [np.zeros(1)], [np.zeros(1)]
    plateaus: list[Plateau] = []
    for low, high in pairwise(stops):
        nodes, heat, action = _stretch(layers, low, high, step)
        t.append(nodes)
        h.append(h[-1][-1] + heat)
        g.append(g[-1][-1] + action)
        for found in _plateaus(layers, high, begin):
            plateau = replace(found, start=float(g[-1][-1]))
            plateaus.append(plateau)
            t.append(np.array([high]))
            h.append(h[-1][-1:] + plateau.share * plateau.latent)
            g.append(np.array([plateau.end]))
    nodes, heat, action = (np.concatenate(part) for part in (t, h, g))
    return Heating(nodes, heat, action, tuple(plateaus), complete=not gaps)


def _active(metal: Metal, low: float, high: float) -> Phase | None:
    """Return the phase that covers an interval, or None where the metal has boiled away."""
    return next((p for p in metal.phases if p.temperature[0] <= low and high <= p.temperature[-1]), None)


def _stretch(
    layers: Sequence[tuple[float, Metal]], low: float, high: float, step: float
) -> tuple[Array, Array, Array]:
    """Return nodes after ``low`` up to ``high``, and enthalpy and action from ``low`` to each of them."""
    active = [(a, p) for a, m in layers if (p := _active(m, low, high))]
    bounds = np.unique(np.concatenate([[low, high], *(p.temperature for _, p in active)]))
    bounds = bounds[(bounds >= low) & (bounds <= high)]
    pieces = [np.linspace(a, b, max(1, int(np.ceil((b - a) / step))) + 1)[1:] for a, b in pairwise(bounds)]
    nodes = np.concatenate([[low], *pieces])
    width = np.diff(nodes)
    inside = nodes[:-1, None] + width[:, None] * _GAUSS_X
    heat, conductivity = np.zeros(inside.shape), np.zeros(inside.shape)
    for share, p in active:
        heat += share * np.interp(inside, p.temperature, p.heat)
        conductivity += share / np.interp(inside, p.temperature, p.resistivity)
    return (
        nodes[1:],
        np.cumsum(width * (heat @ _GAUSS_W)),
        np.cumsum(width * ((heat * conductivity) @ _GAUSS_W)),
    )


def _plateaus(layers: Sequence[tuple[float, Metal]], at: float, begin: float) -> list[Plateau]:
    """Return what changes at a temperature, layer by layer, with the conductance of all others at that moment."""
    found: list[Plateau] = []
    # Resistivity of every layer just below ``at``; replaced as its own change is done.
    now = [_resistivity(m, at) for _, m in layers]
    for k, (share, metal) in enumerate(layers):
        others = sum(
            a / r for j, ((a, _), r) in enumerate(zip(layers, now, strict=True)) if j != k and np.isfinite(r)
        )
        for (kind, latent), below, above in zip(metal.changes, metal.phases, metal.phases[1:], strict=False):
            if below.temperature[-1] == at and at > begin:
                after = float(above.resistivity[0])
                if latent > 0:
                    found.append(Plateau(kind, k, at, latent, now[k], after, share, others))
                now[k] = after
        if metal.last is not None and metal.phases[-1].temperature[-1] == at:
            kind, latent = metal.last
            after = np.inf if kind == "vaporisation" else now[k]
            found.append(Plateau(kind, k, at, latent, now[k], after, share, others))
            now[k] = after
    return found


def _resistivity(metal: Metal, at: float) -> float:
    """Return the resistivity on the cold side of a temperature; infinite where the metal has boiled away."""
    for p in metal.phases:
        if p.temperature[0] <= at <= p.temperature[-1]:
            return float(np.interp(at, p.temperature, p.resistivity))
    return float("inf")
