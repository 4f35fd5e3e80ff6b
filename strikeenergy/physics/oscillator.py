"""Loads in time and what an oscillator makes of them: exact integration, dynamic load factors.

The undamped or lightly damped oscillator from rest, written in the load that would hold it where it is::

    u'' + 2·ζ·ω·u' + ω²·u = ω²·w(t),    u = ω²/ω_d·Im ∫ w(s)·exp(μ·(t − s)) ds,    μ = −ζ·ω + i·ω_d,  ω_d = ω·sqrt(1 − ζ²)

Integrated exactly for a load of straight or parabolic pieces (the square of a current of straight pieces is made of
parabolas) and for sums of exponentials: no time step limits it. The **dynamic load factor** is the highest |u| over the
highest load. For any load of one sign it is at most 2, and at most ω·∫w dt over the highest load.

Units: SI: times s, ``omega`` rad/s, frequencies Hz, ``damping`` ζ (1); a load in any unit (N, N/m), u in the same.
Source: N. C. Nigam and P. C. Jennings, Bulletin of the Seismological Society of America 59 (1969), for the recursion
from piece to piece; here in complex form. Leaves out: damping that depends on the motion, yielding.
"""

from __future__ import annotations

import math
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

__all__ = [
    "Exponentials",
    "Extent",
    "Pulse",
    "dynamic_load_factor",
    "exponential_load_factor",
    "exponentials_of_current",
    "extent",
    "impulse",
    "load_at",
    "oscillators",
    "pulse_of_current",
    "slope_variation",
    "watch_times",
]

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]


class Pulse(NamedTuple):
    """A load in pieces: values at rising times, and halfway between them (None: straight pieces). Zero outside."""

    time: Array
    load: Array
    middle: Array | None = None


class Exponentials(NamedTuple):
    """A load Σ amplitude·exp(−rate·t) for t ≥ 0 (rates in 1/s, above zero)."""

    amplitude: Array
    rate: Array


def pulse_of_current(time: ArrayLike, current: ArrayLike, factor: float = 1.0) -> Pulse:
    """Load factor·i² of a current given by samples and straight between them: exact, with its impulse factor·W/R."""
    t, i = np.asarray(time, dtype=np.float64), np.asarray(current, dtype=np.float64)
    if t.ndim != 1 or t.shape != i.shape or len(t) < 2 or not (np.diff(t) > 0).all():
        raise ValueError("a current needs two or more samples at rising times")
    return Pulse(t, factor * i**2, factor * ((i[:-1] + i[1:]) / 2) ** 2)


def exponentials_of_current(amplitude: ArrayLike, tau: ArrayLike, factor: float = 1.0) -> Exponentials:
    """Load factor·i² of a current Σ amplitude·exp(−t/τ): every product of two terms is an exponential again."""
    a, s = (
        np.atleast_1d(np.asarray(amplitude, dtype=np.float64)),
        1 / np.atleast_1d(np.asarray(tau, dtype=np.float64)),
    )
    return Exponentials(factor * np.outer(a, a).ravel(), np.add.outer(s, s).ravel())


def _pieces(p: Pulse) -> tuple[Array, Array, Array, Array]:
    """Length of each piece and its coefficients: load = f0 + f1·s + f2·s² at s after its beginning."""
    h, f0, f2 = np.diff(p.time), p.load[:-1], np.zeros(len(p.time) - 1)
    if p.middle is not None:
        f2 = 2 * (p.load[:-1] - 2 * p.middle + p.load[1:]) / h**2
    return h, f0, np.diff(p.load) / h - f2 * h, f2


def load_at(load: Pulse | Exponentials, t: Array) -> Array:
    """Value of a load at the times ``t``; nothing outside it."""
    if isinstance(load, Exponentials):
        return np.asarray(np.exp(-np.outer(np.maximum(t, 0), load.rate)) @ load.amplitude * (t >= 0))
    h, f0, f1, f2 = _pieces(load)
    k = np.clip(np.searchsorted(load.time, t, side="right") - 1, 0, len(h) - 1)
    s = t - load.time[k]
    return np.where((t >= load.time[0]) & (t <= load.time[-1]), f0[k] + s * (f1[k] + s * f2[k]), 0.0)


class Extent(NamedTuple):
    """How far a load reaches."""

    begin: float
    """Time (s) at which it begins."""
    end: float
    """Time (s) from which it is nothing; of exponentials, some e^−40."""
    peak: float
    """Highest absolute value."""
    variation: float
    """Total variation, from nothing to nothing: it bounds |u − w|."""
    jumps: float
    """That part of it which happens at once, at the begin and the end."""


def _sampled(load: Exponentials, number: int = 4000) -> Array:
    return np.concatenate([[0.0], np.geomspace(1e-4 / load.rate.max(), 40 / load.rate.min(), number)])


def extent(load: Pulse | Exponentials) -> Extent:
    """Begin, end, highest value, total variation and jumps of a load."""
    if isinstance(load, Exponentials):
        time = _sampled(load)
        nodes = load_at(load, time)
        begin, end, jumps = 0.0, float(time[-1]), abs(float(nodes[0]))
    else:
        nodes = load.load
        if load.middle is not None:
            nodes = np.empty(2 * len(load.load) - 1)
            nodes[::2], nodes[1::2] = load.load, load.middle
        begin, end = float(load.time[0]), float(load.time[-1])
        jumps = abs(float(nodes[0])) + abs(float(nodes[-1]))
    steps = float(np.abs(np.diff(nodes)).sum())
    return Extent(begin, end, float(np.abs(nodes).max()), jumps + steps, jumps)


def impulse(load: Pulse | Exponentials) -> float:
    """Time integral of a load, exact: that of factor·i² is factor·W/R."""
    if isinstance(load, Exponentials):
        return float((load.amplitude / load.rate).sum())
    h, f0, f1, f2 = _pieces(load)
    return float((h * (f0 + h * (f1 / 2 + h * f2 / 3))).sum())


def watch_times(load: Pulse | Exponentials, period: float, step: float) -> Array:
    """Times (s) at which to look for the highest answer: the load's own, and ``step`` apart for one ``period`` after
    the begin and before the end of each of its pieces and after its end. In between, an undamped answer repeats."""
    nodes = load.time if isinstance(load, Pulse) else _sampled(load, 200)
    h = np.diff(nodes)
    reach = np.minimum(h, period)
    count = np.ceil(reach / step).astype(int)
    piece = np.repeat(np.arange(len(h)), count)
    place = np.arange(count.sum()) - np.repeat(np.cumsum(count) - count, count)
    s = place / count[piece] * reach[piece]
    after = nodes[-1] + np.linspace(0.0, period, math.ceil(period / step) + 1)
    return np.unique(np.concatenate([nodes[piece] + s, nodes[piece + 1] - s, after]))


def slope_variation(load: Pulse | Exponentials) -> float:
    """Total variation of the slope of a load, from nothing to nothing: over ω, and with the jumps, it bounds |u − w| too."""
    if isinstance(load, Exponentials):
        slope = load_at(Exponentials(-load.amplitude * load.rate, load.rate), _sampled(load))
        return abs(float(slope[0])) + float(np.abs(np.diff(slope)).sum())
    h, _, f1, f2 = _pieces(load)
    ends = np.stack([f1, f1 + 2 * f2 * h], axis=1).ravel()
    return float(np.abs(np.diff(ends, prepend=0.0, append=0.0)).sum())


def _phi(z: Complex) -> list[Complex]:
    """φ1 = (e^z − 1)/z, φ2 = (φ1 − 1)/z, φ3 = (φ2 − 1/2)/z: by their series where the quotients cancel."""
    small = np.abs(z) < 0.7
    safe: Complex = np.where(small, 1.0 + 0.0j, z)
    one: Complex = np.expm1(safe) / safe
    two: Complex = (one - 1) / safe
    three: Complex = (two - 0.5) / safe
    out = [one, two, three]
    near = z[small]
    for k in range(3):
        total = np.zeros_like(near)
        for n in range(15, -1, -1):  # Horner's rule for Σ z^n/(n + k + 1)!
            total = total * near + 1 / math.factorial(n + k + 1)
        out[k][small] = total
    return out


def _gain(s: Array, mu: Complex, f0: Array, f1: Array, f2: Array) -> Complex:
    """∫ load·exp(μ·(s − σ)) dσ over 0..s within pieces: (times, oscillators)."""
    one, two, three = _phi(np.outer(s, mu))
    return np.asarray((f0 * s)[:, None] * one + (f1 * s**2)[:, None] * two + (2 * f2 * s**3)[:, None] * three)


def _integral(load: Pulse | Exponentials, mu: Complex, t: Array) -> Complex:
    """Z = ∫ load(s)·exp(μ·(t − s)) ds, exactly, at any times: (times, oscillators)."""
    if isinstance(load, Exponentials):
        z = np.zeros((len(t), len(mu)), dtype=np.complex128)
        late = np.maximum(t, 0.0)
        for a, rate in zip(load.amplitude, load.rate, strict=True):
            z += a * (np.exp(np.outer(late, mu)) - np.exp(-late * rate)[:, None]) / (mu + rate)
        return z
    h, f0, f1, f2 = _pieces(load)
    turned, gained = np.exp(np.outer(h, mu)), _gain(h, mu, f0, f1, f2)
    nodes = np.zeros((len(load.time), len(mu)), dtype=np.complex128)
    for j in range(len(h)):
        nodes[j + 1] = nodes[j] * turned[j] + gained[j]
    k = np.clip(np.searchsorted(load.time, t, side="right") - 1, 0, len(h))
    s = np.maximum(t - load.time[k], 0.0)
    z = nodes[k] * np.exp(np.outer(s, mu))
    within = (k < len(h)) & (s > 0)
    piece = k[within]
    z[within] += _gain(s[within], mu, f0[piece], f1[piece], f2[piece])
    return np.asarray(z)


def _exponent(omega: Array, damping: float) -> Complex:
    if not 0 <= damping < 1:
        raise ValueError(f"a damping ratio lies from 0 to below 1, not {damping}")
    return np.asarray(omega * (-damping + 1j * np.sqrt(1 - damping**2)))


def oscillators(load: Pulse | Exponentials, omega: ArrayLike, time: ArrayLike, damping: float = 0.0) -> Array:
    """Answer u (times, oscillators) of u'' + 2·ζ·ω·u' + ω²·u = ω²·w(t) from rest, exact at any times.

    u is the load that would hold the oscillator where it is. Circular frequencies ``omega`` in rad/s, ``time`` in s.
    """
    w = np.atleast_1d(np.asarray(omega, dtype=np.float64))
    mu = _exponent(w, damping)
    z = _integral(load, mu, np.atleast_1d(np.asarray(time, dtype=np.float64)))
    return np.asarray(w**2 / mu.imag * z.imag)


def dynamic_load_factor(load: Pulse | Exponentials, frequency: ArrayLike, damping: float = 0.0) -> Any:
    """Highest answer of an oscillator over the highest load (1), for each frequency (Hz).

    Sought on sixty points a period and on the parabola through the highest: good to 1e-4.
    """
    peak = extent(load).peak
    out = []
    for f in np.atleast_1d(np.asarray(frequency, dtype=np.float64)):
        t = watch_times(load, 1 / f, 1 / (60 * f))
        omega = np.array([2 * np.pi * f])
        mu = _exponent(omega, damping)
        z, w = _integral(load, mu, t)[:, 0], float(omega[0])
        u, speed = w**2 / mu[0].imag * z.imag, w**2 / mu[0].imag * (mu[0] * z).imag
        k = int(np.abs(u).argmax())
        force = w**2 * (load_at(load, t[k : k + 1])[0] - u[k]) - 2 * damping * w * speed[k]
        beyond = -(speed[k] ** 2) / (2 * force) if force * u[k] < 0 else 0.0
        out.append(abs(u[k] + beyond) / peak)
    return np.array(out).reshape(np.shape(frequency))[()]


def exponential_load_factor(a: ArrayLike) -> Any:
    """Dynamic load factor (1) of a load exp(−t/θ), undamped, a = ω·θ, in closed form up to the time of the peak.

    u = a²/(1 + a²)·[sin(ωt)/a − cos ωt + exp(−t/θ)], highest at the first root of cos ωt + a·sin ωt = exp(−t/θ).
    """
    x = np.asarray(a, dtype=np.float64)
    angle = np.arctan(x) + np.pi / 2
    for _ in range(8):
        fade = np.exp(-angle / x)
        angle -= (np.cos(angle) + x * np.sin(angle) - fade) / (-np.sin(angle) + x * np.cos(angle) + fade / x)
    return (x**2 / (1 + x**2) * (np.sin(angle) / x - np.cos(angle) + np.exp(-angle / x)))[()]
