"""Shapes with one formula for front and tail: Heidler function, double exponential, power exponential.

Each can be found from its front time T1 and half-value time T2.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import Any, ClassVar, TypeVar, cast

import numpy as np
from numpy.typing import NDArray

from strikeenergy.errors import InputError, Problem
from strikeenergy.lightning.parameters import Given, Rule, read_parameter, read_parameters
from strikeenergy.lightning.pulse import TAIL, Law, Pulse, panels
from strikeenergy.lightning.sums import Waveform
from strikeenergy.physics import pulses
from strikeenergy.units import Quantity

__all__ = ["DoubleExponential", "Heidler", "PowerExponential"]

AnyPulse = TypeVar("AnyPulse", bound=Pulse)


def _from_times(
    make: Callable[[Given, Any, Any], AnyPulse],
    ends: tuple[float, float],
    peak: Given,
    front: Given,
    half: Given,
    definition: str,
) -> AnyPulse:
    """Make the pulse that has exactly this T1 and T2.

    Args:
        make: pulse of a peak, a shape parameter and a unit of time.
        ends: of the shape parameter, long tail first; T2/T1 changes steadily between them.
        peak: (A).
        front: T1 (s).
        half: T2 (s).
        definition: of T1 and T2.
    """
    times, problems = read_parameters(
        {"front_time": front, "half_value_time": half}, {"front_time": "s", "half_value_time": "s"}
    )
    if problems:
        raise InputError(problems)
    t1 = np.asarray(times["front_time"])
    ratio = np.asarray(times["half_value_time"]) / t1

    def found(log: Any) -> Any:
        pulse = make(1.0, np.exp(log), 1.0)
        return np.log(pulse.half_value_time(definition) / pulse.front_time(definition))

    low, high = np.log(ends)
    limits = np.exp(found(high)), np.exp(found(low))
    if not ((ratio >= limits[0]) & (ratio <= limits[1])).all():
        name = type(make(1.0, ends[1], 1.0)).__name__
        worst = ratio.ravel()[int(np.abs(np.log(ratio / math.sqrt(limits[0] * limits[1]))).argmax())]
        short = "PowerExponential, or Heidler with n = 3 or more" if worst > 1.7 else "Trapezoid"
        use = f"use {'Heidler' if worst > limits[1] else short}"
        reach = f"{name} reaches T2/T1 from {limits[0]:.5g} to {limits[1]:.5g} ({definition})"
        raise InputError(
            [Problem(f"T2/T1 = {worst:.5g} is out of reach: {reach}", use, ("half_value_time",))]
        )
    log = pulses.find_root(
        lambda x: found(x) - np.log(ratio), np.full(ratio.shape, low), np.full(ratio.shape, high)
    )
    shape = np.exp(log)
    return make(peak, shape, t1 / make(1.0, shape, 1.0).front_time(definition))


@dataclass(frozen=True, init=False, eq=False, repr=False)
class Heidler(Pulse):
    """Heidler function of IEC 62305-1:2010 Annex B: (I/k)·x^n/(1 + x^n)·exp(−t/tau2), x = t/tau1.

    With ``normalise="exact"`` k is such that the peak is exactly ``peak``. With ``"standard"`` k is the given one (Annex B
    prints 0.93, 0.986, 0.993) or else the customary exp(−a·(n/a)^(1/n)), a = tau1/tau2, and the peak is slightly off.
    """

    UNITS: ClassVar[Mapping[str, str]] = {"peak": "A", "tau1": "s", "tau2": "s", "n": "1", "k": "1"}
    OPTIONAL: ClassVar[frozenset[str]] = frozenset({"n", "k"})
    LAW = Law(pulses.heidler_current, pulses.heidler_slope, pulses.heidler_specific_energy)

    tau1: Quantity
    tau2: Quantity
    n: Quantity
    k: Quantity
    normalise: str

    @property
    def _constants(self) -> tuple[Quantity, ...]:
        return self.nominal, self.tau1, self.tau2, self.n, self.k

    def __init__(
        self,
        peak: Given,
        tau1: Given,
        tau2: Given,
        n: Given = 10.0,
        normalise: str = "exact",
        k: Given = None,
    ) -> None:
        given = {"peak": peak, "tau1": tau1, "tau2": tau2, "n": n} | ({} if k is None else {"k": k})
        rules: list[Rule] = [
            (
                ("n",),
                lambda n: n >= 1,
                "below 1 the front starts with an infinite slope",
                "write n from 1 up",
            ),
            (
                ("tau1", "tau2", "n"),
                lambda tau1, tau2, n: tau1 <= n * tau2,
                "tau1 is above n·tau2: the decay sets in before the front has risen",
                "use the power exponential with p = n and tau = tau2",
            ),
            (
                ("k",),
                lambda _: normalise == "standard",
                "k is computed for normalise='exact'",
                "leave it out",
            ),
            (
                (),
                lambda: normalise in ("exact", "standard"),
                f"normalise={normalise!r}",
                "write 'exact' or 'standard'",
            ),
        ]
        self._accept(given, rules)
        if k is None:
            exact = normalise == "exact"
            correction = pulses.heidler_correction if exact else pulses.heidler_correction_customary
            self._set(k=correction(self.tau1, self.tau2, self.n))
        self._set(normalise=normalise)

    @property
    def parameters(self) -> dict[str, Quantity]:
        """The parameters by their names in the constructor, in SI; k only where it is not the exact one."""
        values = super().parameters
        return values if self.normalise == "standard" else {k: v for k, v in values.items() if k != "k"}

    @classmethod
    def from_times(
        cls,
        peak: Given,
        front_time: Given,
        half_value_time: Given,
        n: float = 10.0,
        definition: str = "10/90",
    ) -> Heidler:
        """Return the Heidler function with exactly these T1 and T2."""

        def make(peak: Given, a: Any, time: Any) -> Heidler:
            return cls(peak, a * time, time, n)

        ends = (1e-7, n * (1 - 1e-9))
        return _from_times(make, ends, peak, front_time, half_value_time, definition)

    @cached_property
    def peak_time(self) -> Quantity:
        """Time of the peak (s)."""
        return cast(Quantity, self._full(pulses.heidler_peak_time(self.tau1, self.tau2, self.n)))

    @property
    def peak(self) -> Quantity:
        """True peak (A)."""
        return (
            cast(Quantity, self._full(self.nominal))
            if self.normalise == "exact"
            else self.current(self.peak_time)
        )

    @cached_property
    def _integrals(self) -> tuple[Quantity, Quantity]:
        first, second = pulses.heidler_integrals(self.tau1 / self.tau2, self.n)
        return self.nominal / self.k * self.tau1 * first, (self.nominal / self.k) ** 2 * self.tau1 * second

    @property
    def charge(self) -> Quantity:
        """∫ i dt (C)."""
        return self._integrals[0]

    @property
    def specific_energy(self) -> Quantity:
        """∫ i² dt = W/R (J/ohm)."""
        return self._integrals[1]

    @cached_property
    def steepest_time(self) -> Quantity:
        """Time of the largest di/dt (s)."""
        last = np.log(self.peak_time)
        time: Quantity = np.exp(pulses.maximise(lambda y: self.slope(np.exp(y)), last - 40.0, last))
        return time

    def _knots(self) -> NDArray[np.float64]:
        # The rise lives on ln t, in panels short against its poles at |arg t| = π/n; the decay lives on t.
        n, crest = np.asarray(self.n), np.log(self.peak_time / self.tau1)
        low, high = np.minimum(crest, 0) - 37 / (n + 1), np.minimum(37 / n, np.log(self._end / self.tau1))
        number = int(np.ceil(((high - low) / np.minimum(0.45, 4.6 / n)).max()))
        rise = self.tau1 * np.exp(panels((low, high, number)))
        tail = panels((self.peak_time, self._end, int(12 + 2 * np.sqrt(n.max()))))
        return np.sort(np.concatenate([np.zeros((1, *self.shape)), rise, tail]), axis=0)

    @property
    def _end(self) -> Quantity:
        end: Quantity = self.peak_time + self.tau2 * (TAIL + np.sqrt(80 * np.asarray(self.n)))
        return end


@dataclass(frozen=True, init=False, eq=False, repr=False)
class DoubleExponential(Pulse):
    """Difference of two exponentials, I0·(e^(−alpha·t) − e^(−beta·t)); ``peak`` is the peak, ``amplitude`` is I0."""

    UNITS: ClassVar[Mapping[str, str]] = {"peak": "A", "alpha": "1/s", "beta": "1/s"}
    LAW = Law(
        pulses.double_exponential_current,
        pulses.double_exponential_slope,
        pulses.double_exponential_specific_energy,
        pulses.double_exponential_charge_until,
    )

    alpha: Quantity
    beta: Quantity

    def __init__(self, peak: Given, alpha: Given, beta: Given) -> None:
        order = "beta is the rate of the front and must be above alpha, that of the tail"
        rule: Rule = (("alpha", "beta"), lambda alpha, beta: beta > alpha, order, "exchange them")
        self._accept({"peak": peak, "alpha": alpha, "beta": beta}, [rule])

    @classmethod
    def from_amplitude(cls, amplitude: Given, alpha: Given, beta: Given) -> DoubleExponential:
        """Take I0 in place of the peak, as SAE ARP5412 and EUROCAE ED-84 print it."""
        unit = cls(1.0, alpha, beta)
        return cls(read_parameter(amplitude, "A") / unit.amplitude, unit.alpha, unit.beta)

    @classmethod
    def from_times(
        cls, peak: Given, front_time: Given, half_value_time: Given, definition: str = "10/90"
    ) -> DoubleExponential:
        """Return the double exponential with exactly these T1 and T2; refused below T2/T1 = 3.8047 (10/90)."""

        def make(peak: Given, s: Any, time: Any) -> DoubleExponential:
            return cls(peak, 1 / time, (1 + s) / time)

        return _from_times(make, (1e8, 1e-6), peak, front_time, half_value_time, definition)

    @property
    def _constants(self) -> tuple[Quantity, ...]:
        return self.amplitude, self.alpha, self.beta

    @property
    def amplitude(self) -> Quantity:
        """I0 (A)."""
        return self.nominal / pulses.double_exponential_current(self.peak_time, 1.0, self.alpha, self.beta)

    @cached_property
    def peak_time(self) -> Quantity:
        """Time of the peak (s)."""
        return cast(Quantity, self._full(pulses.double_exponential_peak_time(self.alpha, self.beta)))

    @property
    def charge(self) -> Quantity:
        """∫ i dt (C)."""
        return self.amplitude * (self.beta - self.alpha) / (self.alpha * self.beta)

    def _overlap(self, other: Waveform, delay: Quantity) -> Any:
        """∫ other(t)·self(t − delay) dt, exact with another double exponential."""
        if not isinstance(other, DoubleExponential):
            return None
        late, early = np.maximum(delay, 0.0), np.minimum(delay, 0.0)

        def product(p: Quantity, q: Quantity) -> Any:
            return np.exp(-p * late + q * early) / (p + q)

        slow = product(other.alpha, self.alpha) - product(other.alpha, self.beta)
        fast = product(other.beta, self.alpha)
        return other.amplitude * self.amplitude * (slow - fast + product(other.beta, self.beta))

    def _knots(self) -> NDArray[np.float64]:
        return panels((0.0, TAIL / self.beta, 11), (TAIL / self.beta, TAIL / self.alpha + self.peak_time, 12))


@dataclass(frozen=True, init=False, eq=False, repr=False)
class PowerExponential(Pulse):
    """Power times exponential, I·(t/(p·tau))^p·e^(p − t/tau): 8/20, 4/10 and other short-tailed test currents."""

    UNITS: ClassVar[Mapping[str, str]] = {"peak": "A", "p": "1", "tau": "s"}
    LAW = Law(
        pulses.power_exponential_current,
        pulses.power_exponential_slope,
        pulses.power_exponential_specific_energy,
        pulses.power_exponential_charge_until,
    )

    p: Quantity
    tau: Quantity

    def __init__(self, peak: Given, p: Given, tau: Given) -> None:
        steep = "below 1 the front starts with an infinite slope"
        rule: Rule = (("p",), lambda p: p >= 1, steep, "write p from 1 up, or use the Heidler function")
        self._accept({"peak": peak, "p": p, "tau": tau}, [rule])

    @classmethod
    def from_times(
        cls, peak: Given, front_time: Given, half_value_time: Given, definition: str = "10/90"
    ) -> PowerExponential:
        """Return the power exponential with exactly these T1 and T2; T2/T1 from 1.7 to 3.8 (10/90)."""

        def make(peak: Given, p: Any, time: Any) -> PowerExponential:
            return cls(peak, np.maximum(p, 1), time)

        return _from_times(make, (1.0, 1e4), peak, front_time, half_value_time, definition)

    @property
    def peak_time(self) -> Quantity:
        """Time of the peak (s)."""
        return cast(Quantity, self._full(self.p * self.tau))

    @property
    def steepest_time(self) -> Quantity:
        """Time of the largest di/dt (s)."""
        return cast(Quantity, self._full(self.tau * (self.p - np.sqrt(self.p))))

    def _knots(self) -> NDArray[np.float64]:
        crest, spread = self.peak_time, self.tau * (np.sqrt(80 * np.asarray(self.p)) + 50)
        front = np.log(crest)
        rise = np.exp(panels((front - 14, front, 40)))
        return np.concatenate([np.zeros((1, *self.shape)), rise, panels((crest, crest + spread, 16))[1:]])
