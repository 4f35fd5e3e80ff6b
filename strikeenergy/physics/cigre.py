"""The concave front of CIGRE TB 63 (1991), with its two-exponential tail.

Given are the nominal peak I (A), the front t_f (s), the largest steepness S_m (A/s) and the time to half value t_h (s)::

    S_N = S_m·t_f/I,   n = 1 + 2·(S_N − 1)·(2 + 1/S_N),   t_n = 0.6·t_f·3·S_N²/(1 + S_N²)
    front, t ≤ t_n:    i = A·t + B·t^n,   A = (0.9·n·I/t_n − S_m)/(n − 1),   B·t_n^n = (S_m·t_n − 0.9·I)/(n − 1)
    tail:              i = I1·e^(−s/t1) − I2·e^(−s/t2),   s = t − t_n
    t1 = (t_h − t_n)/ln 2,   t2 = 0.1·I/S_m,   I1, I2 = t1·t2/(t1 − t2)·(S_m + 0.9·I/t2 or t1)

Value (0.9·I) and slope (S_m) are continuous at t_n. B alone is of the order 1e57 to 1e96 in SI; it is only used as
B·t_n^n·(t/t_n)^n. Shapes: numbers or arrays; they broadcast.

Valid for S_N > 1 and t1 > t2. Leaves out the second, higher peak of measured first strokes; the true peak is 0.4 to
1.1 % below the nominal one for the usual constants, which is a property of the published formula.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from strikeenergy.physics.pulses import Values


class Concave(NamedTuple):
    """The constants that the formula derives: front A·t + C·(t/t_n)^n, tail I1·e^(−s/t1) − I2·e^(−s/t2)."""

    power: Values
    """n (1)"""
    steepest: Values
    """t_n (s), where the front ends at its steepest"""
    linear: Values
    """A (A/s)"""
    curved: Values
    """C = B·t_n^n (A)"""
    t1: Values
    t2: Values
    i1: Values
    i2: Values


def concave(peak: Values, front: Values, max_steepness: Values, half_value_time: Values) -> Concave:
    """Derive the constants of the concave front. CIGRE TB 63 (1991)."""
    s = max_steepness * front / peak
    n = 1 + 2 * (s - 1) * (2 + 1 / s)
    tn = 1.8 * front * s**2 / (1 + s**2)
    t1, t2 = (half_value_time - tn) / np.log(2.0), 0.1 * peak / max_steepness
    joint = t1 * t2 / (t1 - t2)
    return Concave(
        n,
        tn,
        (0.9 * n * peak / tn - max_steepness) / (n - 1),
        (max_steepness * tn - 0.9 * peak) / (n - 1),
        t1,
        t2,
        joint * (max_steepness + 0.9 * peak / t2),
        joint * (max_steepness + 0.9 * peak / t1),
    )


def concave_current(t: Values, c: Concave) -> Values:
    """Current (A)."""
    early = np.minimum(np.maximum(t, 0.0), c.steepest)
    late = np.maximum(t - c.steepest, 0.0)
    front = c.linear * early + c.curved * (early / c.steepest) ** c.power
    tail = c.i1 * np.exp(-late / c.t1) - c.i2 * np.exp(-late / c.t2)
    return np.where(np.asarray(t) <= c.steepest, front, tail)[()]


def concave_slope(t: Values, c: Concave) -> Values:
    """Derivative (A/s). Its largest value is S_m, at t_n, from both sides."""
    early = np.minimum(np.maximum(t, 0.0), c.steepest)
    late = np.maximum(t - c.steepest, 0.0)
    front = c.linear + c.curved * c.power / c.steepest * (early / c.steepest) ** (c.power - 1)
    tail = c.i2 / c.t2 * np.exp(-late / c.t2) - c.i1 / c.t1 * np.exp(-late / c.t1)
    return np.where(np.asarray(t) < 0, 0.0, np.where(np.asarray(t) <= c.steepest, front, tail))[()]


def concave_peak_time(c: Concave) -> Values:
    """Time of the true peak (s), on the tail: t_n + ln(I2·t1/(I1·t2))·t1·t2/(t1 − t2)."""
    return c.steepest + np.log(c.i2 * c.t1 / (c.i1 * c.t2)) * c.t1 * c.t2 / (c.t1 - c.t2)


def concave_charge_until(t: Values, c: Concave) -> Values:
    """Charge up to the time t (C); in the limit A·t_n²/2 + B·t_n^(n+1)/(n+1) + I1·t1 − I2·t2."""
    early = np.minimum(np.maximum(t, 0.0), c.steepest)
    late = np.maximum(t - c.steepest, 0.0)
    front = c.linear * early**2 / 2 + c.curved * early * (early / c.steepest) ** c.power / (c.power + 1)
    return front - c.i1 * c.t1 * np.expm1(-late / c.t1) + c.i2 * c.t2 * np.expm1(-late / c.t2)


def concave_specific_energy(c: Concave) -> Values:
    """Specific energy (J/ohm), the squares of front and tail integrated term by term."""
    a, b, n, tn = c.linear * c.steepest, c.curved, c.power, c.steepest
    front = tn * (a**2 / 3 + 2 * a * b / (n + 2) + b**2 / (2 * n + 1))
    tail = c.i1**2 * c.t1 / 2 - 2 * c.i1 * c.i2 * c.t1 * c.t2 / (c.t1 + c.t2) + c.i2**2 * c.t2 / 2
    return front + tail
