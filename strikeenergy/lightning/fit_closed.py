"""Currents with given peak, charge and specific energy in closed form, for what no Heidler function has."""

from __future__ import annotations

import numpy as np

from strikeenergy.lightning.fit_targets import Array
from strikeenergy.lightning.piecewise_shapes import LinearFront, Trapezoid
from strikeenergy.lightning.sums import Sum
from strikeenergy.physics import pulses

__all__ = ["flat_top", "impulse_and_tail"]


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


def impulse_and_tail(known: dict[str, Array], weight: float) -> Sum:
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


def flat_top(known: dict[str, Array]) -> Trapezoid:
    """Straight front, flat top, straight fall: exact in peak, charge and specific energy, and in the front time.

    Q/I = top + (front + fall)/2 and (W/R)/I² = top + (front + fall)/3.
    """
    peak = known["peak"]
    q, e = known["charge"] / peak, known["specific_energy"] / peak**2
    edges = np.maximum(6 * (q - e), 0.0)
    front = np.minimum(known["front_time"], edges) if "front_time" in known else edges / 2
    return Trapezoid(peak, front, np.maximum(3 * e - 2 * q, 0.0) + edges, edges - front)
