"""Laws of one quantity: log-normal, two-slope, mixtures, and the number of strokes.

Units: a law carries none; its values are in whatever SI unit its median has (A, C, J/ohm, s). Probabilities
are plain numbers. Shapes: every argument may be a number or an array, results have the broadcast shape.

The sigma of a log-normal is held once, as the standard deviation of the *natural* logarithm. IEC 62305-1
prints that of the decimal logarithm, CIGRE TB 63 that of the natural one; they differ by ln 10 = 2.30. There
is therefore no constructor that takes "sigma": :meth:`LogNormal.from_log10`, :meth:`LogNormal.from_ln` and
:meth:`LogNormal.from_95_5` say which they mean.

Leaves out: sampling uncertainty of the published parameters (first negative strokes rest on about 100
observations, positive ones on 26), so far tails are extrapolations.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import cast

import numpy as np
from numpy.typing import ArrayLike, NDArray

from strikeenergy.errors import InputError, Problem

__all__ = [
    "Array",
    "LogNormal",
    "Marginal",
    "Mixture",
    "StrokeNumber",
    "TwoSlopeLogNormal",
    "positive_number",
    "share_problem",
]

Array = NDArray[np.float64]
LN10 = math.log(10.0)
Z95 = 1.645
"""Normal score of 95 % as IEC 62305-1 rounds it: its printed sigmas are log10(x5/x95)/(2·1.645)."""


def positive_number(value: object) -> bool:
    """Whether this is a finite number above zero (a truth value is not)."""
    return isinstance(value, (int, float)) and not isinstance(value, bool) and 0 < value < math.inf


def share_problem(value: object, what: str) -> list[Problem]:
    """Say what is wrong with something that should be a share from 0 to 1."""
    if isinstance(value, (int, float)) and not isinstance(value, bool) and 0 <= value <= 1:
        return []
    return [Problem(f"{what} is {value!r}, not a share", "write a number from 0 to 1")]


def _probabilities(p: ArrayLike) -> Array:
    values = np.asarray(p, dtype=np.float64)
    if not bool(np.all((values >= 0) & (values <= 1))):  # also catches nan
        raise InputError([Problem("a probability lies outside 0 to 1", "write a number such as 0.05")])
    return values


@dataclass(frozen=True)
class LogNormal:
    """A quantity whose logarithm is normal.

    Attributes:
        median: the value that half of the observations exceed, in SI.
        sigma: standard deviation of the natural logarithm (1). Prefer the named constructors.

    Raises:
        InputError: median or sigma not a finite number above zero; both are named where both are wrong.
    """

    median: float
    sigma: float

    def __post_init__(self) -> None:
        problems = [
            Problem(f"{what} of a log-normal law is {value!r}", "write a finite number above zero")
            for what, value in (("the median", self.median), ("sigma", self.sigma))
            if not positive_number(value)
        ]
        if problems:
            raise InputError(problems)

    @classmethod
    def from_log10(cls, median: float, sigma_log10: float) -> LogNormal:
        """Make it of median and standard deviation of the decimal logarithm (IEC 62305-1 Annex A)."""
        return cls(median, sigma_log10 * LN10)

    @classmethod
    def from_ln(cls, median: float, sigma_ln: float) -> LogNormal:
        """Make it of median and standard deviation of the natural logarithm (CIGRE TB 63, IEEE)."""
        return cls(median, sigma_ln)

    @classmethod
    def from_95_5(cls, x95: float, x5: float) -> LogNormal:
        """Make it of the values that 95 % and 5 % of the observations exceed: median √(x95·x5), z = 1.645."""
        if not (positive_number(x95) and positive_number(x5) and x5 > x95):
            raise InputError(
                [
                    Problem(
                        f"{x95!r} and {x5!r} are no 95 % and 5 % values",
                        "the value exceeded by 5 % is the larger one",
                    )
                ]
            )
        return cls(math.sqrt(x95 * x5), math.log(x5 / x95) / (2 * Z95))

    @property
    def sigma_log10(self) -> float:
        """Standard deviation of the decimal logarithm."""
        return self.sigma / LN10

    def score(self, x: ArrayLike) -> Array:
        """Normal score of a value; minus infinity at and below zero."""
        values = np.asarray(x, dtype=np.float64)
        with np.errstate(divide="ignore", invalid="ignore"):
            z = np.log(values / self.median) / self.sigma
        return np.where(values <= 0, -np.inf, z)[()]

    def log(self, z: Array) -> Array:
        """Natural logarithm of the value with the normal score ``z``."""
        return math.log(self.median) + self.sigma * z

    def cdf(self, x: ArrayLike) -> Array:
        """Probability that the quantity stays at or below ``x``."""
        from scipy.special import ndtr

        return cast(Array, ndtr(self.score(x)))

    def exceedance(self, x: ArrayLike) -> Array:
        """Probability that the quantity is above ``x``; keeps its digits far out in the tail."""
        from scipy.special import ndtr

        return cast(Array, ndtr(-self.score(x)))

    def quantile(self, p: ArrayLike) -> Array:
        """Value below which the share ``p`` stays; 0 for p = 0, infinity for p = 1."""
        from scipy.special import ndtri

        return cast(Array, np.exp(self.log(ndtri(_probabilities(p)))))


@dataclass(frozen=True)
class TwoSlopeLogNormal:
    """Two log-normal branches that meet at a knee: the first negative peak of IEC 62305-1 and CIGRE TB 63.

    Both branches are printed to so few digits that they miss each other at the knee (IEC: 0.80015 against
    0.80006 at 20 kA, TB 63: 0.7991 against 0.8003). The median of the lower branch is therefore moved within
    its printed digits (61.1 to 61.09 kA; 61 to 61.35 kA), so that the law is continuous there.

    Attributes:
        below: branch for values below the knee.
        above: branch for values above it.
        knee: where they meet, in the unit of the medians.

    Raises:
        InputError: the knee is not a finite number above zero, or the branches miss each other there by more
            than 0.005 in probability (they then do not belong together).
    """

    below: LogNormal
    above: LogNormal
    knee: float

    def __post_init__(self) -> None:
        if not positive_number(self.knee):
            raise InputError([Problem(f"the knee is {self.knee!r}", "write a finite number above zero")])
        low, high = float(self.below.cdf(self.knee)), float(self.above.cdf(self.knee))
        if abs(low - high) > 0.005:
            raise InputError(
                [
                    Problem(
                        f"the branches give {low:.4f} and {high:.4f} at the knee",
                        "both must give the same share there",
                    )
                ]
            )
        closed = self.knee * math.exp(-self.below.sigma * float(self.above.score(self.knee)))
        object.__setattr__(self, "below", LogNormal(closed, self.below.sigma))

    def score(self, x: ArrayLike) -> Array:
        """Normal score of a value."""
        values = np.asarray(x, dtype=np.float64)
        return np.where(values < self.knee, self.below.score(values), self.above.score(values))[()]

    def log(self, z: Array) -> Array:
        """Natural logarithm of the value with the normal score ``z``."""
        # Two straight lines that cross at the knee: the steeper one is the lower one on its left.
        choose = np.minimum if self.below.sigma >= self.above.sigma else np.maximum
        return choose(self.below.log(z), self.above.log(z))

    def cdf(self, x: ArrayLike) -> Array:
        """Probability that the quantity stays at or below ``x``."""
        values = np.asarray(x, dtype=np.float64)
        return np.where(values < self.knee, self.below.cdf(values), self.above.cdf(values))[()]

    def exceedance(self, x: ArrayLike) -> Array:
        """Probability that the quantity is above ``x``."""
        values = np.asarray(x, dtype=np.float64)
        return np.where(values < self.knee, self.below.exceedance(values), self.above.exceedance(values))[()]

    def quantile(self, p: ArrayLike) -> Array:
        """Value below which the share ``p`` stays."""
        from scipy.special import ndtri

        return cast(Array, np.exp(self.log(ndtri(_probabilities(p)))))

    @property
    def median(self) -> float:
        """The value that half of the observations exceed."""
        return float(self.quantile(0.5))


Marginal = LogNormal | TwoSlopeLogNormal
"""A law of one quantity of one sort of stroke."""


@dataclass(frozen=True)
class Mixture:
    """Several laws, each with its share.

    Attributes:
        laws: the laws.
        shares: share of each (1); they add up to one.

    Raises:
        InputError: no laws, as many shares as laws are not given, a share outside 0 to 1, or their sum is not
            1.
    """

    laws: tuple[Marginal, ...]
    shares: tuple[float, ...]

    def __post_init__(self) -> None:
        problems = []
        if not self.laws or len(self.laws) != len(self.shares):
            problems.append(
                Problem(f"{len(self.laws)} laws with {len(self.shares)} shares", "give one share a law")
            )
        for number, share in enumerate(self.shares):
            problems += share_problem(share, f"share {number + 1} of the mixture")
        if not problems and abs(math.fsum(self.shares) - 1) > 1e-9:
            problems.append(
                Problem(f"the shares add up to {math.fsum(self.shares):.9g}", "they must add up to 1")
            )
        if problems:
            raise InputError(problems)

    def cdf(self, x: ArrayLike) -> Array:
        """Probability that the quantity stays at or below ``x``."""
        return cast(Array, sum(w * law.cdf(x) for w, law in zip(self.shares, self.laws, strict=True)))

    def exceedance(self, x: ArrayLike) -> Array:
        """Probability that the quantity is above ``x``."""
        return cast(Array, sum(w * law.exceedance(x) for w, law in zip(self.shares, self.laws, strict=True)))

    def quantile(self, p: ArrayLike) -> Array:
        """Value below which the share ``p`` stays, by bisection of the logarithm to the last digits."""
        targets = _probabilities(p)
        live = [law for w, law in zip(self.shares, self.laws, strict=True) if w > 0]
        ends = np.array([law.quantile(targets) for law in live])
        with np.errstate(divide="ignore"):
            low, high = np.log(ends.min(axis=0)), np.log(ends.max(axis=0))
        inside = (targets > 0) & (targets < 1)
        low, high = np.where(inside, low, 0.0), np.where(inside, high, 0.0)
        for _ in range(60):
            middle = 0.5 * (low + high)
            under = self.cdf(np.exp(middle)) < targets
            low, high = np.where(under, middle, low), np.where(under, high, middle)
        found = np.exp(0.5 * (low + high))
        return np.where(targets <= 0, 0.0, np.where(targets >= 1, np.inf, found))[()]


@dataclass(frozen=True)
class StrokeNumber:
    """How many strokes a flash has: a share with one only, and for the others 2 plus a geometric number.

    Two published figures (share of single-stroke flashes, mean number) fix it. The geometric form is assumed.

    Attributes:
        single: share of flashes with one stroke (1).
        mean: mean number of strokes of all flashes (1).

    Raises:
        InputError: not a share, or a mean that the share of single strokes does not allow.
    """

    single: float
    mean: float

    def __post_init__(self) -> None:
        problems = share_problem(self.single, "the share of single-stroke flashes")
        if not problems and not (positive_number(self.mean) and self.mean >= 2 - self.single - 1e-12):
            least = 2 - self.single
            problems.append(
                Problem(f"a mean of {self.mean!r} strokes is not possible", f"it is at least {least:g}")
            )
        if not problems and self.single == 1 and self.mean != 1:
            problems.append(Problem(f"all flashes have one stroke, yet the mean is {self.mean!r}", "write 1"))
        if problems:
            raise InputError(problems)

    @property
    def _further(self) -> float:
        """Mean number of strokes beyond the second, of the flashes that have two."""
        return 0.0 if self.single == 1 else max((self.mean - self.single) / (1 - self.single) - 2, 0.0)

    def probability(self, n: ArrayLike) -> Array:
        """Probability of exactly ``n`` strokes."""
        count = np.asarray(n)
        ratio = self._further / (1 + self._further)
        many = (1 - self.single) * (1 - ratio) * ratio ** np.maximum(count - 2, 0)
        return np.where(count < 1, 0.0, np.where(count == 1, self.single, many))[()]

    def draw(self, rng: np.random.Generator, n: int) -> NDArray[np.int32]:
        """Draw ``n`` numbers of strokes, from one exponential variate each."""
        if self.single == 1:
            return np.ones(n, dtype=np.int32)
        # What an exponential variate has above a threshold is exponential again: one serves both questions.
        rest = rng.standard_exponential(n)
        rest += math.log1p(-self.single)
        if self._further == 0:
            return np.where(rest < 0, 1, 2).astype(np.int32)
        rest *= 1 / math.log1p(1 / self._further)
        np.maximum(np.floor(rest, out=rest), -1.0, out=rest)
        rest += 2.0
        return rest.astype(np.int32)
