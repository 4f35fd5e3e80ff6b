"""From figures to a waveform: a current that has a given peak, charge, specific energy, front and half-value time.

A single Heidler function always has W/R > 0.5·I·Q. Below, the tail needs a second, slower term; above about 0.7·I·Q the
top must be flat. Both have closed forms.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, cast

import numpy as np
from numpy.typing import NDArray

from strikeenergy.errors import InputError, Problem
from strikeenergy.lightning.figures import lower_point
from strikeenergy.lightning.fit_closed import flat_top, impulse_and_tail
from strikeenergy.lightning.fit_search import (
    MOST_N,
    Projection,
    projection_of,
    scaled_heidler,
    search_line,
    search_plane,
)
from strikeenergy.lightning.fit_targets import DESIGN, SLACK, Array, Fitted, measured, read_targets
from strikeenergy.lightning.mixed import Mixed
from strikeenergy.lightning.parameters import Given, read_parameter
from strikeenergy.lightning.smooth_shapes import Heidler
from strikeenergy.lightning.sums import Waveform
from strikeenergy.units import Quantity

__all__ = ["FitResult", "Mixed", "fit"]

_MET = 1e-7
"""Relative residual below which a target counts as met."""
_NEAR = 1e-8  # in logarithms; the tables are good to 1e-10
_WEIGHT = 0.2
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
    values = read_targets(given, lower_point(definition))
    weight, n = read_parameter(weight, "1"), None if n is None else read_parameter(n, "1")
    if np.ndim(weight) or np.ndim(n) or not 0 < weight < 1 or not (n is None or 1 <= n <= MOST_N):
        raise InputError([Problem("weight must be between 0 and 1, n between 1 and 120", "leave them out")])
    names = tuple(name for name in DESIGN if name in values)
    if np.linalg.matrix_rank(np.array([DESIGN[name] for name in names]).reshape(-1, 2)) < 2:
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
        projection, fixed = projection_of(self.names), 10.0 if n is None else float(n)
        everything = np.arange(len(self.target))
        if len(self.names) == 2:
            pattern = Heidler.from_times(1.0, 10e-6, 350e-6, fixed)
            log_a = np.full(everything.size, np.log(pattern.tau1 / pattern.tau2))
        else:
            log_a = search_line(self.target, projection, fixed, self.definition)
        waveform, self.off = scaled_heidler(self.target, projection, log_a, fixed, self.definition)
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

    def _try_others(self, projection: Projection, weight: float) -> None:
        known, target, names, definition = self.known, self.target, self.names, self.definition
        triple = {"peak", "charge", "specific_energy"} <= known.keys()
        rho = (
            known["specific_energy"] / (known["peak"] * known["charge"])
            if triple
            else np.full(len(target), 0.6)
        )
        where = np.flatnonzero((self.left > _NEAR) & (rho > 0.5) & (rho < 0.72))
        if where.size:
            log_a, free_n = search_plane(target[where], projection, definition)
            self._offer(FREE, where, scaled_heidler(target[where], projection, log_a, free_n, definition))
        if not triple:
            return
        front = known.get("front_time", np.zeros(len(target)))
        q, e = (
            known["charge"] / known["peak"] - front / 2,
            known["specific_energy"] / known["peak"] ** 2 - front / 3,
        )
        unmet = self.left > _NEAR
        for method, possible in ((TAIL, (e > 0) & (e <= q / 2 * SLACK)), (FLAT, rho >= 2 / 3 / SLACK)):
            where = np.flatnonzero(unmet & possible)
            if where.size:
                some = {name: value[where] for name, value in known.items()}
                made = impulse_and_tail(some, weight) if method == TAIL else flat_top(some)
                self._offer(method, where, measured(made, target[where], names, definition))

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
