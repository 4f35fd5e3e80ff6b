"""A set of lightning statistics as a whole: laws of its quantities, rarity of a value, random flashes.

Units: SI throughout (A, C, J/ohm, s, A/s).
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from types import MappingProxyType
from typing import Any, Literal, cast

import numpy as np
from numpy.typing import ArrayLike, NDArray

from strikeenergy.errors import InputError, Problem, UnknownName
from strikeenergy.formatting import format_number, format_quantity, pretty
from strikeenergy.lightning.joint import Correlation, JointLaw
from strikeenergy.lightning.marginals import Array, LogNormal, Marginal, Mixture, StrokeNumber, share_problem
from strikeenergy.lightning.published_laws import COMPONENTS, QUANTITIES, ContinuingCurrent, PublishedLaw
from strikeenergy.sources import Constant, Source, Standing, source, weakest
from strikeenergy.units import convert

__all__ = ["Population", "Rarity", "Sample"]

_CHUNK = 65536  # flashes drawn at a time: fits the cache. Changing it changes what a seed gives.


@dataclass(frozen=True, eq=False)
class Sample:
    """Random flashes, all of them possible ones. Read-only arrays of shape (n,).

    Attributes:
        population: name of the set.
        seed: the seed that gives the same flashes again (with the same numpy generation).
        correlation: the one assumed.
        bound: the charge in W/R <= I·Q: of the ``"flash"`` or of the ``"short"`` stroke.
        acceptance: by ``"positive"``, ``"first negative"`` and ``"all"``: share of the proposed (I, Q, W/R)
            that a current can have; nan where nothing was proposed.
        polarity: +1 or -1.
        peak: of the first stroke (A).
        charge: of the flash (C).
        short_charge: of the first short stroke (C), at most ``charge``.
        specific_energy: W/R (J/ohm), at most peak x charge.
        strokes: number of strokes.
        continuing: whether a long continuing current follows one of the strokes.
        continuing_duration: how long it lasts (s); 0 where there is none.
        continuing_peak: peak (A) of the stroke it follows; 0 where there is none.
    """

    population: str
    seed: int
    correlation: Correlation
    bound: Literal["flash", "short"]
    acceptance: Mapping[str, float]
    polarity: NDArray[np.int8]
    peak: Array
    charge: Array
    short_charge: Array
    specific_energy: Array
    strokes: NDArray[np.int32]
    continuing: NDArray[np.bool_]
    continuing_duration: Array
    continuing_peak: Array

    def __len__(self) -> int:
        return int(self.peak.size)


@dataclass(frozen=True)
class Rarity:
    """How rare a value is.

    Attributes:
        quantity: one of :data:`QUANTITIES`.
        value: in SI.
        unit: of the value.
        exceedance: probability that a flash or stroke of the component exceeds the value; ``"all"`` is the
            mixture of positive and negative flashes. A component without a law of this quantity is left out.
        standing: of the weakest law used.
    """

    quantity: str
    value: float
    unit: str
    exceedance: Mapping[str, float]
    standing: Standing


@dataclass(frozen=True)
class Population:
    """A named set of laws, and how its flashes are drawn.

    Attributes:
        name: of the set.
        laws: by quantity and component.
        positive_share: share of positive flashes (1).
        correlation: of peak, charge and W/R.
        strokes: law of the number of strokes, by component.
        stroke_means: the mean numbers of strokes with their origin.
        continuing: long continuing currents.
        remarks: what whoever uses the set must know: text, standing, source.
        bound: the charge in W/R <= I·Q, that of the ``"flash"`` or of the ``"short"`` stroke.

    Raises:
        InputError: impossible parameters, all of them named.
    """

    name: str
    laws: Mapping[str, Mapping[str, PublishedLaw]]
    positive_share: Constant
    correlation: Correlation
    strokes: Mapping[str, StrokeNumber]
    stroke_means: Mapping[str, Constant]
    continuing: ContinuingCurrent
    remarks: tuple[tuple[str, Standing, Source], ...] = ()
    bound: Literal["flash", "short"] = "flash"

    def __post_init__(self) -> None:
        problems = share_problem(self.positive_share.value, "the share of positive flashes")
        if self.bound not in ("flash", "short"):
            problems.append(Problem(f"the charge in the bound is {self.bound!r}", "write 'flash' or 'short'"))
        for component, share in self.continuing.share.items():
            problems += share_problem(
                share.value, f"the share of {component} flashes with continuing current"
            )
        if not problems and self._eligible * (1 + 1e-12) < self.continuing.share["first negative"].value:
            problems.append(
                Problem(
                    "more negative flashes have continuing current than the joint law permits "
                    f"({self.continuing.share['first negative'].value:g} against {self._eligible:.3g})",
                    "lower the share, or give fewer flashes a single stroke",
                )
            )
        if float(self._published("peak", "subsequent").law.cdf(self.continuing.peak.value)) < 0.01:
            limit = format_quantity(self.continuing.peak.value, "A")
            problems.append(
                Problem(
                    f"hardly any subsequent stroke stays below {limit}, so that none has continuing current",
                    "give a weaker law of the subsequent peak",
                )
            )
        if not problems:
            for component in ("positive", "first negative"):
                lost = self.joint(component).infeasible_share()
                if lost > 0.98:
                    problems.append(
                        Problem(
                            f"{lost:.1%} of the {component} flashes of this set are impossible (W/R > I·Q)",
                            "give laws or a correlation that belong together",
                        )
                    )
        if problems:
            raise InputError(problems)

    @cached_property
    def _eligible(self) -> float:
        """Share of negative flashes that may have a continuing current: several strokes or a weak one."""
        strong = float(self.laws["peak"]["first negative"].law.exceedance(self.continuing.peak.value))
        return 1 - self.strokes["first negative"].single * strong

    def joint(self, component: str) -> JointLaw:
        """Return the joint law of peak, charge and W/R of ``"positive"`` or ``"first negative"`` flashes."""
        names = ("peak", "charge", "specific_energy", "short_charge")
        peak, charge, energy, short = (self._published(name, component).law for name in names)
        if not (
            isinstance(charge, LogNormal) and isinstance(energy, LogNormal) and isinstance(short, LogNormal)
        ):
            raise InputError("only the peak may have two slopes in the joint law")
        return JointLaw(peak, charge, energy, short, self.correlation, self.bound)

    def _published(self, quantity: str, component: str) -> PublishedLaw:
        if quantity not in QUANTITIES:
            raise UnknownName("quantity", quantity, QUANTITIES)
        rows = self.laws.get(quantity, {})
        if component in rows:
            return rows[component]
        if component not in (*COMPONENTS, "all"):
            raise UnknownName("component", component, (*COMPONENTS, "all", *rows))
        have = ", ".join(repr(row) for row in rows) or "nothing"
        wanted = (
            f"no law of {quantity} for {component!r}" if component != "all" else f"no mixture for {quantity}"
        )
        raise InputError([Problem(f"{self.name!r} has {wanted}", f"it has {have}")])

    def law(self, quantity: str, component: str = "all") -> Marginal | Mixture:
        """Return the published law of a quantity.

        Args:
            quantity: one of :data:`QUANTITIES`.
            component: one of :data:`COMPONENTS`, or ``"all"``: positive and (first) negative in their shares.

        Raises:
            UnknownName: no such quantity or component.
            InputError: the set has no such law; says which it has.
        """
        rows = self.laws.get(quantity, {})
        if component == "all" and "positive" in rows and "first negative" in rows:
            share = self.positive_share.value
            return Mixture((rows["first negative"].law, rows["positive"].law), (1 - share, share))
        return self._published(quantity, component).law

    def exceedance(self, quantity: str, value: ArrayLike, component: str = "all") -> Array:
        """Probability that a flash (or stroke) exceeds a value (SI; number or array). See :meth:`law`."""
        return self.law(quantity, component).exceedance(value)

    def quantile(self, quantity: str, p: ArrayLike, component: str = "all") -> Array:
        """Value (SI) below which the share ``p`` of the flashes (or strokes) stays. See :meth:`law`."""
        return self.law(quantity, component).quantile(p)

    def rarity(self, values: Mapping[str, float]) -> tuple[Rarity, ...]:
        """Say how rare each of several values is.

        Args:
            values: in SI, by quantity: ``{"peak": 200e3, "charge": 300.0, "specific_energy": 10e6}``.

        Raises:
            UnknownName: no such quantity.
            InputError: values that are no finite numbers from zero up (all named).
        """
        problems = [
            Problem(f"{name} is {value!r}", "write a finite number from zero up, in SI", (name,))
            for name, value in values.items()
            if isinstance(value, bool) or not isinstance(value, (int, float)) or not 0 <= value < math.inf
        ]
        if problems:
            raise InputError(problems)
        found = []
        for name, value in values.items():
            if name not in QUANTITIES:
                raise UnknownName("quantity", name, QUANTITIES)
            rows = self.laws.get(name, {})
            shown = {c: float(rows[c].law.exceedance(value)) for c in COMPONENTS if c in rows}
            if "positive" in shown and "first negative" in shown:
                shown["all"] = float(self.exceedance(name, value))
            rank = weakest(row.standing for row in rows.values())
            found.append(Rarity(name, float(value), QUANTITIES[name][0], MappingProxyType(shown), rank))
        return tuple(found)

    def draw(self, quantity: str, n: int, seed: int, component: str = "all") -> Array:
        """Draw one quantity by itself: intervals between strokes, flash durations, times, steepnesses.

        Independent of every other quantity, and of :meth:`sample`: to draw peak, charge and W/R so would give
        flashes that no current has.

        Args:
            quantity: one of :data:`QUANTITIES`.
            n: how many.
            seed: the same seed gives the same values.
            component: see :meth:`law`.

        Returns:
            Values in SI, of shape (n,).

        Raises:
            UnknownName: no such quantity or component.
            InputError: no law of it; ``n`` or the seed is no whole number.
        """
        _check_draw(n, seed)
        # The generator may give 0, where the laws end; it never gives 1.
        u = np.maximum(np.random.default_rng(seed).random(n), 2.0**-54)
        return self.quantile(quantity, u, component)

    def sample(self, n: int, seed: int) -> Sample:
        """Draw random flashes that a current can be.

        Args:
            n: how many.
            seed: the same seed gives the same flashes.

        Raises:
            InputError: ``n`` is not a whole number from 1 up, or the seed not one from 0 up.
        """
        _check_draw(n, seed)
        rng = np.random.default_rng(seed)
        polarity = np.empty(n, dtype=np.int8)
        out: dict[str, NDArray[Any]] = {
            name: np.empty(n) for name in ("peak", "charge", "specific_energy", "short_charge")
        }
        out |= {"strokes": np.empty(n, dtype=np.int32), "continuing": np.zeros(n, dtype=np.bool_)}
        out |= {"continuing_duration": np.zeros(n), "continuing_peak": np.zeros(n)}
        laws = {component: self.joint(component) for component in ("first negative", "positive")}
        drawn, proposed = dict.fromkeys(laws, 0), dict.fromkeys(laws, 0)
        for start in range(0, n, _CHUNK):
            part = slice(start, min(start + _CHUNK, n))
            positive = rng.random(part.stop - start) < self.positive_share.value
            polarity[part] = np.where(positive, 1, -1)
            for component, joint in laws.items():
                # Each sort is refilled by itself: the conditioning must not shift the share of positive ones.
                where = np.flatnonzero(positive if component == "positive" else ~positive)
                if not where.size:
                    continue
                values, tries = joint.draw(rng, where.size)
                drawn[component] += int(where.size)
                proposed[component] += tries
                strokes, long, *rest = self._structure(rng, component, values[0])
                for name, column in zip(out, (*values, strokes), strict=False):
                    out[name][part][where] = column
                for name, current in zip(list(out)[5:], (True, *rest), strict=True):
                    out[name][part][where[long]] = current
        for array in (polarity, *out.values()):
            array.setflags(write=False)
        acceptance = {c: drawn[c] / proposed[c] if proposed[c] else math.nan for c in laws}
        acceptance["all"] = n / sum(proposed.values())
        return Sample(
            self.name,
            int(seed),
            self.correlation,
            self.bound,
            MappingProxyType(acceptance),
            polarity,
            **cast(dict[str, Any], out),
        )

    def _structure(
        self, rng: np.random.Generator, component: str, peak: Array
    ) -> tuple[NDArray[np.int32], NDArray[np.intp], Array, Array]:
        """Draw number of strokes; which have a continuing current, its duration, the peak it follows."""
        law = self.continuing
        strokes = self.strokes[component].draw(rng, peak.size)
        share, negative = law.share[component].value, component != "positive"
        if negative:
            share = share / self._eligible if self._eligible else 0.0
        flag = rng.random(peak.size) < share
        if negative:
            flag &= (strokes > 1) | (peak <= law.peak.value)
        long = np.flatnonzero(flag)
        duration = rng.standard_exponential(long.size)
        duration *= law.excess[component].value
        duration += law.duration.value
        followed = peak[long]
        if negative:
            # In a negative flash of several strokes it is taken to follow a later one, which must be weak.
            weak = self.laws["peak"]["subsequent"].law
            again = np.flatnonzero(strokes[long] > 1)
            while again.size:
                followed[again] = fresh = np.exp(weak.log(rng.standard_normal(again.size)))
                again = again[fresh > law.peak.value]
        return strokes, long, duration, followed

    def describe(self) -> list[tuple[str, Standing, Source]]:
        """Say what the set consists of and what to beware of: text, standing, source."""
        share, cc, r = self.positive_share, self.continuing, self.correlation
        out = [(f"{share.value:.3g} of the flashes are positive", share.standing, share.source)]
        for quantity, rows in self.laws.items():
            for component, row in rows.items():
                text = f"{QUANTITIES[quantity][2]}, {component}: {_spell(row.law, QUANTITIES[quantity][1])}"
                out.append((f"{text} ({row.note})" if row.note else text, row.standing, row.source))
        own = source("engineering")
        standing_r = Standing.ASSUMED if r == Correlation() else Standing.GIVEN
        text = f"r(I,Q) = {r.peak_charge:g}, r(I,W) = {r.peak_energy:g}, r(Q,W) = {r.charge_energy:g}"
        out.append(
            (f"correlation of the normal scores: {text}, r(Q,Qshort) = {r.charges:g}", standing_r, own)
        )
        for component in ("positive", "first negative"):
            lost = self.joint(component).infeasible_share()
            text = f"{lost:.1%} of the {component} flashes drawn so are no current (W/R > I·Q): drawn anew"
            out.append((text, Standing.DERIVED, own))
            number, mean = self.strokes[component], self.stroke_means[component]
            text = f"strokes, {component}: {number.single:.3g} have one, mean {number.mean:g}"
            out.append((f"{text}; geometric beyond two (assumed)", mean.standing, mean.source))
            part, more = cc.share[component], cc.excess[component]
            text = f"{part.value:g} of the {component} flashes have one (set {cc.name!r})"
            out.append((f"long continuing current: {text}", part.standing, part.source))
            text = f"{cc.duration.value * 1e3:g} ms and {more.value * 1e3:g} ms more on average"
            out.append((f"long continuing current, {component}: {text}", more.standing, more.source))
        text = f"none follows a negative stroke above {format_quantity(cc.peak.value, 'A')}"
        return [
            *out,
            (f"long continuing current: {text} (highly unlikely)", cc.peak.standing, cc.peak.source),
            *self.remarks,
        ]


def _check_draw(n: int, seed: int) -> None:
    problems = [
        Problem(f"{what} is {value!r}", f"write a whole number from {least} up")
        for what, value, least in (("the number of values", n, 1), ("the seed", seed, 0))
        if isinstance(value, bool) or not isinstance(value, (int, np.integer)) or value < least
    ]
    if problems:
        raise InputError(problems)


def _spell(law: Marginal, shown: str) -> str:
    if isinstance(law, LogNormal):
        median = format_number(cast(float, convert(law.median, shown)))
        return f"median {median} {pretty(shown)}, sigma {law.sigma_log10:.3f} (log10), {law.sigma:.3f} (ln)"
    knee = f"{format_number(cast(float, convert(law.knee, shown)))} {pretty(shown)}"
    return f"below {knee} {_spell(law.below, shown)}; above it {_spell(law.above, shown)}"
