"""The joint law of peak, charge and specific energy of a flash, and their correlation."""

from __future__ import annotations

import math
from dataclasses import dataclass, fields
from functools import cached_property
from typing import Literal, cast

import numpy as np
from numpy.typing import ArrayLike, NDArray

from strikeenergy.errors import InputError, Problem
from strikeenergy.lightning.marginals import Array, LogNormal, Marginal

__all__ = ["Correlation", "JointLaw"]

_MARGIN = 1e-12  # keeps W/R <= I·Q true after the exponential has rounded


@dataclass(frozen=True)
class Correlation:
    """Correlation of the normal scores of peak, charge and W/R, the same for flash and short-stroke charge.

    The published coefficients could not be verified (they are called moderate to high); the defaults are
    assumed, and a conclusion that hangs on them should be tried with others.

    Attributes:
        peak_charge: peak with charge (1).
        peak_energy: peak with specific energy (1).
        charge_energy: charge with specific energy (1).
        charges: flash charge with short-stroke charge (1).

    Raises:
        InputError: a value that is not between -1 and 1, or a matrix that is not positive definite.
    """

    peak_charge: float = 0.60
    peak_energy: float = 0.85
    charge_energy: float = 0.75
    charges: float = 0.80

    def __post_init__(self) -> None:
        problems = []
        for field in fields(self):
            value = getattr(self, field.name)
            if not (isinstance(value, (int, float)) and not isinstance(value, bool) and -1 < value < 1):
                problems.append(
                    Problem(f"correlation {field.name} is {value!r}", "write a number between -1 and 1")
                )
        if not problems:
            least = float(np.linalg.eigvalsh(self.matrix()).min())
            if least <= 1e-9:
                problems.append(
                    Problem(
                        f"nothing can be correlated like this: the matrix has the eigenvalue {least:.3g}",
                        "two quantities that both go with a third must go with each other",
                    )
                )
        if problems:
            raise InputError(problems)

    def matrix(self) -> Array:
        """Return the 4 x 4 matrix in the order peak, charge, specific energy, short-stroke charge."""
        a, b, c, k = self.peak_charge, self.peak_energy, self.charge_energy, self.charges
        return np.array([[1, a, b, a], [a, 1, c, k], [b, c, 1, c], [a, k, c, 1]], dtype=np.float64)


@dataclass(frozen=True)
class JointLaw:
    """Peak, flash charge, W/R and short-stroke charge of a flash together (gaussian copula, conditioned).

    The published marginal laws, drawn together, hold combinations that no current can have: a current that
    never reverses has W/R <= I·Q. These are left out (and drawn anew), so the drawn marginals differ a little
    from the published ones. The other charge follows from its conditional law, cut so that the short stroke
    never has more charge than its flash; this changes nothing in peak, charge and W/R.

    Leaves out: Q²/T <= W/R (no duration is drawn), polarity changes within a flash, any time dependence.

    Attributes:
        peak: law of the peak (A).
        charge: law of the flash charge (C).
        specific_energy: law of W/R (J/ohm).
        short_charge: law of the charge of the (first) short stroke (C).
        correlation: of the normal scores.
        bound: the charge in W/R <= I·Q: that of the ``"flash"`` (W/R may have been integrated over more than
            the first short stroke), or that of the ``"short"`` stroke alone (stricter).
    """

    peak: Marginal
    charge: LogNormal
    specific_energy: LogNormal
    short_charge: LogNormal
    correlation: Correlation = Correlation()
    bound: Literal["flash", "short"] = "flash"

    @cached_property
    def _root(self) -> Array:
        # Drawing order: peak, the charge in the bound, W/R, the other charge. The two charges correlate alike
        # with the rest, so that one matrix serves both choices.
        return cast(Array, np.linalg.cholesky(self.correlation.matrix()))

    @property
    def _charges(self) -> tuple[LogNormal, LogNormal]:
        return (self.charge, self.short_charge) if self.bound == "flash" else (self.short_charge, self.charge)

    def infeasible_share(self) -> float:
        """Share of the unconditioned joint law that no current can have (W/R > I·Q), to about 1e-6.

        Given the peak, ln(W/R) - ln Q is normal; what remains is one integral over the score of the peak.
        """
        from scipy.special import ndtr

        z = np.linspace(-9.0, 9.0, 7201)
        charge, energy, r = self._charges[0], self.specific_energy, self.correlation
        mean = energy.log(r.peak_energy * z) - charge.log(r.peak_charge * z) - self.peak.log(z)
        variance = (
            energy.sigma**2 * (1 - r.peak_energy**2)
            + charge.sigma**2 * (1 - r.peak_charge**2)
            - 2 * energy.sigma * charge.sigma * (r.charge_energy - r.peak_charge * r.peak_energy)
        )
        density = np.exp(-0.5 * z * z) / math.sqrt(2 * math.pi)
        return float(np.sum(density * ndtr(mean / math.sqrt(variance))) * (z[1] - z[0]))

    def transform(self, normals: ArrayLike) -> Array:
        """Turn independent standard normals into values of the *unconditioned* law.

        For weighted or quasi-random sampling and for diagnosis: part of the result no current can have, see
        :meth:`feasible`.

        Args:
            normals: shape (..., 4).

        Returns:
            Shape (..., 4): peak (A), flash charge (C), W/R (J/ohm), short-stroke charge (C).
        """
        z = np.asarray(normals, dtype=np.float64) @ self._root.T
        laws = (self.peak, self._charges[0], self.specific_energy, self._charges[1])
        values = np.exp(np.stack([law.log(z[..., k]) for k, law in enumerate(laws)], axis=-1))
        return values if self.bound == "flash" else values[..., [0, 3, 2, 1]]

    def feasible(self, values: ArrayLike) -> NDArray[np.bool_]:
        """Whether a current can have these values (shape (..., 4) as from :meth:`transform`)."""
        peak, charge, energy, short = np.moveaxis(np.asarray(values, dtype=np.float64), -1, 0)
        allowed = (energy <= peak * (charge if self.bound == "flash" else short)) & (short <= charge)
        return cast(NDArray[np.bool_], allowed)

    def draw(self, rng: np.random.Generator, n: int) -> tuple[Array, int]:
        """Draw ``n`` feasible flashes.

        Returns:
            The values, shape (4, n): peak, flash charge, W/R, short-stroke charge; and how many (I, Q, W/R)
            were proposed for them.
        """
        other, sign = self._charges[1], 1.0 if self.bound == "flash" else -1.0
        z = rng.standard_normal((4, n))
        logs = self._three(z)
        proposals, todo = n, np.arange(0)
        bad = np.flatnonzero(logs[2] > logs[0] + logs[1] - _MARGIN)
        while bad.size:
            todo = todo[bad] if todo.size else bad
            z[:3, todo] = fresh = rng.standard_normal((3, bad.size))
            logs[:3, todo] = again = self._three(fresh)[:3]
            proposals += int(bad.size)
            bad = np.flatnonzero(again[2] > again[0] + again[1] - _MARGIN)
        root = self._root[3]
        score, work = logs[3], np.empty(n)
        np.multiply(z[0], root[0], out=score)
        for k in (1, 2):
            np.multiply(z[k], root[k], out=work)
            score += work
        z[3] *= root[3]
        score += z[3]
        # Score of the other charge at which it would equal the one in the bound.
        limit = np.subtract(logs[1], math.log(other.median), out=work)
        limit /= other.sigma
        over = np.flatnonzero(score > limit if sign > 0 else score < limit)
        score[over] = self._cut(rng, score[over] - z[3, over], limit[over], sign)
        score *= other.sigma
        score += math.log(other.median)
        values = np.exp(logs, out=logs)
        # The cut ends exactly at the other charge; rounding must not carry it beyond.
        (np.minimum if sign > 0 else np.maximum)(values[3], values[1], out=values[3])
        return (values if self.bound == "flash" else values[[0, 3, 2, 1]]), proposals

    def _three(self, z: Array) -> Array:
        """Logarithms of peak, the charge in the bound and W/R in the first of four rows, from independent normals.

        Works in place, row by row: this is where a large sample spends its time beside the random numbers.
        """
        logs, work = np.empty((4, z.shape[1])), np.empty(z.shape[1])
        logs[0] = self.peak.log(z[0])
        for row, law in ((1, self._charges[0]), (2, self.specific_energy)):
            np.multiply(z[0], law.sigma * self._root[row, 0], out=logs[row])
            for k in range(1, row + 1):
                np.multiply(z[k], law.sigma * self._root[row, k], out=work)
                logs[row] += work
            logs[row] += math.log(law.median)
        return logs

    def _cut(self, rng: np.random.Generator, mean: Array, limit: Array, sign: float) -> Array:
        """Draw from the conditional normal law on the permitted side of its limit, by inversion."""
        from scipy.special import log_ndtr, ndtr, ndtri, ndtri_exp

        spread = self._root[3, 3]
        edge = sign * (limit - mean) / spread
        if edge.size and edge.min() < -30:  # beyond the range of the plain functions, which cost half
            score = ndtri_exp(log_ndtr(edge) - rng.standard_exponential(edge.size))
        else:
            score = ndtri(ndtr(edge) * (1 - rng.random(edge.size)))  # 1 - [0, 1) is never zero
        return cast(Array, mean + sign * spread * score)
