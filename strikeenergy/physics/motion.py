"""Motion of spans under a magnetic force: vibration modes, dynamic load factors, bending, reactions, and their limits.

Bernoulli's beam m·ÿ + EI·y'''' = w(t), uniform load, from rest. With modes φ (∫φ² dξ = 1, ξ = x/l from 0 to 1),
participation Γ = ∫φ dξ, and the undamped or lightly damped oscillator u (the load that would hold the same deflection)::

    y(ξ, t) = Σ Γ·φ(ξ)·u/(m·ω²),    u'' + 2·ζ·ω·u' + ω²·u = ω²·w(t),    ω = λ²/l²·sqrt(EI/m)

The oscillators and the loads stand in ``oscillator``. The modal sum is the *static* answer to w(t) plus
Σ s·(u − w) over the modes taken (s their static parts); what is left out is then bounded, since
|u − w| ≤ min(V(w), jumps + V(w')/ω), V being the total variation, and |u| ≤ ω·∫w dt.

Units: SI: ``l`` span (m), ``EI`` bending stiffness (N·m²), ``m`` mass per length (kg/m), ``w`` load per length (N/m),
``J`` its time integral (N·s/m), bending moments N·m, frequencies Hz, ``omega`` rad/s, ``zeta`` damping ratio (1).
Ends, at ξ = 0 and ξ = 1: "pinned-pinned", "fixed-fixed", "fixed-pinned", "cantilever" (fixed and free).

Sources: D. Young and R. P. Felgar, Tables of Characteristic Functions (1949); S. P. Timoshenko, Vibration Problems in
Engineering; N. Jones, Structural Impact, for the plastic
beam; IEC 60865-1 for the factors of supports.

Validity: small deflections, elastic (except the rigid-plastic law); modes whose half-wave is longer than several
depths. Leaves out: shear and rotary inertia, tension from stretching, slipping fixings, the change of the force as the
span moves, the softening of a heated conductor (put its stiffness and yield strength in).
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from strikeenergy.note import Formula
from strikeenergy.physics.oscillator import (
    Exponentials,
    Pulse,
    extent,
    impulse,
    load_at,
    oscillators,
    slope_variation,
    watch_times,
)

__all__ = [
    "BENDING_STRESS",
    "ENDS",
    "IMPULSE_DEFLECTION",
    "IMPULSE_MOMENT",
    "IMPULSE_REACTION",
    "IMPULSE_SPEED",
    "IMPULSE_STRESS_ROD",
    "NATURAL_FREQUENCY",
    "PLASTIC_DEFLECTION",
    "PLASTIC_MOMENT_ROD",
    "SHORT_PULSE_FACTOR",
    "STATIC",
    "STATIC_DEFLECTION",
    "STATIC_MOMENT",
    "STATIC_REACTION",
    "Modes",
    "SpanResponse",
    "StaticBeam",
    "impulse_factors",
    "modes",
    "shapes",
    "span_response",
    "static_shapes",
]

Array = NDArray[np.float64]

# -- closed forms ------------------------------------------------------------------------------------------

NATURAL_FREQUENCY = Formula("lambda_**2/(2*pi*l**2)*sqrt(EI/m)")
"""Natural frequency (Hz) of a span; ``lambda_`` from :func:`modes`. λ²/2π = 1.571, 2.454, 3.561, 0.560 for the first
mode of pinned, fixed and pinned, fixed, cantilever spans. IEC 60865-1 prints 1.57, 2.45, 3.56."""

STATIC_DEFLECTION = Formula("k*w*l**4/EI")
"""Largest deflection (m) under a steady uniform load; ``k`` from STATIC."""

STATIC_MOMENT = Formula("k*w*l**2")
"""Bending moment (N·m) under a steady uniform load; ``k`` from STATIC."""

STATIC_REACTION = Formula("k*w*l")
"""Force (N) on a support under a steady uniform load; ``k`` from STATIC."""

BENDING_STRESS = Formula("M/Z")
"""Bending stress (Pa) of a moment ``M`` (N·m) and an elastic section modulus ``Z`` (m³)."""

IMPULSE_SPEED = Formula("J/m")
"""Speed (m/s) of a free conductor after the impulse."""

IMPULSE_MOMENT = Formula("k*J*sqrt(EI/m)")
"""Bending moment (N·m) of one mode after a pulse that is short against its period, whatever the span; k = |Γ·φ''|/λ²."""

IMPULSE_DEFLECTION = Formula("k*J*l**2/sqrt(EI*m)")
"""Deflection (m) of one mode after a short pulse; k = |Γ·φ|/λ²."""

IMPULSE_REACTION = Formula("k*J/l*sqrt(EI/m)")
"""Force (N) of one mode on a support after a short pulse; k = |Γ·φ'''|/λ². Pinned, first mode: k = 4."""

IMPULSE_STRESS_ROD = Formula("8/pi*J/A*sqrt(E_Y/gamma)")
"""Bending stress (Pa) of the first mode of a pinned solid round rod of section ``A`` (m²), modulus ``E_Y`` (Pa) and density
``gamma`` (kg/m³) after a short pulse: neither span nor diameter matters besides the section."""

SHORT_PULSE_FACTOR = Formula("omega*T_W")
"""Dynamic load factor (1) of a pulse that is short against the period; T_W = (W/R)/I². It is an upper bound for any pulse
of one sign: the equivalent load then depends on W/R alone."""

PLASTIC_MOMENT_ROD = Formula("d**3*sigma_y/6")
"""Plastic bending moment (N·m) of a solid round rod of diameter ``d`` (m) and yield strength ``sigma_y`` (Pa)."""

PLASTIC_DEFLECTION = Formula("m*v0**2*l**2/(12*M_p)")
"""Permanent deflection (m) at the middle of a pinned rigid-plastic span set off at the speed ``v0``: hinges travel from the
supports to the middle. Leaves out elastic energy and tension: an upper bound beyond one depth of section."""


class StaticBeam(NamedTuple):
    """Factors of a span under a uniform load."""

    deflection: float
    """Largest, over w·l⁴/EI."""
    moment_start: float
    """At ξ = 0, over w·l²."""
    moment_span: float
    """Largest away from the ends, over w·l²."""
    reaction_start: float
    """At ξ = 0, over w·l: the larger of the two."""
    reaction_end: float
    """At ξ = 1, over w·l."""
    beta: float | None
    """Factor β of IEC 60865-1, with plastic redistribution: σ = V·β·F·l/(8·Z)."""


STATIC = {
    "pinned-pinned": StaticBeam(5 / 384, 0.0, 1 / 8, 0.5, 0.5, 1.0),
    "fixed-fixed": StaticBeam(1 / 384, 1 / 12, 1 / 24, 0.5, 0.5, 0.5),
    "fixed-pinned": StaticBeam((39 + 55 * 33**0.5) / 65536, 1 / 8, 9 / 128, 0.625, 0.375, 0.73),
    "cantilever": StaticBeam(1 / 8, 1 / 2, 0.0, 1.0, 0.0, None),
}
"""Beam tables. Continuous runs: the middle support of two spans carries 1.25·w·l, an inner one of many about 1.1·w·l."""

ENDS = tuple(STATIC)
_STATIC_POLYNOMIAL = {
    "pinned-pinned": ([0, 1, 0, -2, 1], 24),
    "fixed-fixed": ([0, 0, 1, -2, 1], 24),
    "fixed-pinned": ([0, 0, 3, -5, 2], 48),
    "cantilever": ([0, 0, 6, -4, 1], 24),
}


def static_shapes(ends: str, xi: ArrayLike) -> Array:
    """Deflection over w·l⁴/EI and its first three derivatives by ξ (4, n): y, slope, M/(w·l²), V/(w·l)."""
    coefficients, divisor = _STATIC_POLYNOMIAL[_known(ends)]
    shape = np.polynomial.Polynomial(coefficients) / divisor
    x = np.asarray(xi, dtype=np.float64)
    return np.stack([shape.deriv(k)(x) if k else shape(x) for k in range(4)])


# -- modes -------------------------------------------------------------------------------------------------


class Modes(NamedTuple):
    """Vibration modes of a uniform beam, in rising frequency."""

    ends: str
    lam: Array
    """Roots λ = l·(m·ω²/EI)^¼ (n,)."""
    participation: Array
    """Γ = ∫φ dξ (n,). Γ² is the part of the mass, or of the energy of a uniform impulse, in each mode: all make 1."""


def _known(ends: str) -> str:
    if ends not in STATIC:
        raise ValueError(f"unknown ends {ends!r}; there are {', '.join(ENDS)}")
    return ends


def modes(ends: str, number: int) -> Modes:
    """Compute the first ``number`` modes. Roots by Newton's method from their limits for high modes, to rounding.

    sin λ = 0 (pinned), cos λ = ±1/cosh λ (fixed; cantilever: −), tan λ = tanh λ (fixed and pinned).
    """
    n = np.arange(1.0, number + 1.0)
    lam: Array
    if _known(ends) == "pinned-pinned":
        lam = np.pi * n
        return Modes(ends, lam, np.sqrt(2) * (1 - np.cos(lam)) / lam)
    if ends == "fixed-pinned":
        lam = (n + 0.25) * np.pi
        for _ in range(6):
            tanh = np.tanh(lam)
            change = (np.sin(lam) - tanh * np.cos(lam)) / (tanh * (np.sin(lam) + tanh * np.cos(lam)))
            lam = lam - change
    else:
        sign = 1.0 if ends == "cantilever" else -1.0
        lam = (n - sign * 0.5) * np.pi
        for _ in range(6):
            sech = 2 * np.exp(-lam) / (1 + np.exp(-2 * lam))
            lam = lam + (np.cos(lam) + sign * sech) / (np.sin(lam) + sign * sech * np.tanh(lam))
    found = Modes(ends, lam, np.empty(number))
    integral = (_clamped(found, np.array([1.0]), -1) - _clamped(found, np.array([0.0]), -1))[:, 0]
    # Symmetric spans: every second mode moves as much up as down. Its participation is zero, not rounding.
    return found._replace(participation=np.where(np.abs(integral) > 1e-12, integral, 0.0))


def _clamped(m: Modes, xi: Array, derivative: int) -> Array:
    """φ = cosh λξ − cos λξ − σ·(sinh λξ − sin λξ), a derivative or (−1) the integral, (modes, points).

    The hyperbolic part is written as (c·exp(−λ(1 − ξ)) + (1 + σ)·exp(−λξ))/2 with c = (1 − σ)·exp λ, which neither
    overflows nor cancels in high modes.
    """
    sign = -1.0 if m.ends == "cantilever" else 1.0
    lam, small = m.lam, np.exp(-m.lam)
    below = 1 - small**2 - sign * 2 * small * np.sin(lam)
    c = 2 * (sign * (np.cos(lam) - np.sin(lam)) - small) / below
    sigma = 1 - c * small
    x = lam[:, None] * xi
    rising = c[:, None] / 2 * np.exp(x - lam[:, None])
    falling = (1 + sigma[:, None]) / 2 * np.exp(-x) * (-1.0) ** (derivative % 2)
    turn = derivative * np.pi / 2
    round_part = -np.cos(x + turn) + sigma[:, None] * np.sin(x + turn)
    return np.asarray((rising + falling + round_part) * lam[:, None] ** derivative)


def shapes(m: Modes, xi: ArrayLike, derivative: int = 0) -> Array:
    """Mode shapes φ, or a derivative by ξ up to the third, (modes, points): ∫φ² dξ = 1."""
    x = np.atleast_1d(np.asarray(xi, dtype=np.float64))
    if m.ends == "pinned-pinned":
        angle = m.lam[:, None] * x + derivative * np.pi / 2
        return np.asarray(np.sqrt(2) * m.lam[:, None] ** derivative * np.sin(angle))
    return _clamped(m, x, derivative)


# -- spans -------------------------------------------------------------------------------------------------


def impulse_factors(ends: str, xi: ArrayLike, number: int = 1) -> Array:
    """Factors k of IMPULSE_DEFLECTION, IMPULSE_MOMENT and IMPULSE_REACTION (3, modes, points): |Γ·φ|, |Γ·φ''|, |Γ·φ'''| over λ²."""
    m = modes(ends, number)
    scale = (m.participation / m.lam**2)[:, None]
    return np.stack([np.abs(scale * shapes(m, xi, k)) for k in (0, 2, 3)])


class SpanResponse(NamedTuple):
    """Highest absolute values over the times watched, and an estimate of their errors.

    Each error is the bound of the modes left out plus, as a root of a sum of squares over the modes taken, what they
    may do between the times watched.
    """

    xi: Array
    deflection: Array
    """At xi (n,), m."""
    deflection_error: Array
    moment: Array
    """At xi (n,), N·m."""
    moment_error: Array
    reaction: Array
    """At both ends (2,), N."""
    reaction_error: Array


def span_response(
    load: Pulse | Exponentials,
    ends: str,
    length: float,
    stiffness: float,
    mass: float,
    *,
    number: int = 40,
    xi: ArrayLike = (0.0, 0.25, 0.5, 0.75, 1.0),
    damping: float = 0.0,
    periods: float = 1.0,
) -> SpanResponse:
    """Deflection, bending moment and reactions of a span under a uniform load w(t), by a modal sum from rest.

    Args:
        load: per length (N/m), of one sign throughout.
        ends: one of ENDS.
        length: of the span (m).
        stiffness: EI (N·m²).
        mass: per length (kg/m).
        number: of modes taken.
        xi: places where deflection and moment are wanted, from 0 to 1.
        damping: ratio ζ of every mode.
        periods: of the first mode after the load has ended, that are watched. Undamped modes of a pinned span repeat after
            one; those of the others never do, and may add up to a little more later.
    """
    tail = modes(ends, max(600, 4 * number))
    omega = tail.lam**2 / length**2 * np.sqrt(stiffness / mass)
    taken = np.flatnonzero(tail.participation[:number])
    reaches, first = extent(load), 2 * np.pi / omega[0]
    # Half a radian of the highest mode apart, but no more than some ten thousands of times.
    step = 0.5 / omega[number - 1]
    held = watch_times(load, periods * first, periods * first)
    step = max(step, float(np.minimum(np.diff(held), periods * first).sum()) / 30_000)
    t = watch_times(load, periods * first, step)
    w = load_at(load, t)
    answer = oscillators(load, omega[taken], t, damping)
    apart = answer - w[:, None]
    reach = np.minimum(reaches.variation, reaches.jumps + slope_variation(load) / omega)
    # Modes left out follow the load, or, where it is over before they stir, do not move at all: |u| ≤ ω·∫w dt.
    still = np.abs(impulse(load)) * omega
    asleep = (still < reach) & (np.arange(len(omega)) >= number)
    reach = np.where(asleep, still, reach)
    reach[:number] = 0.0
    # The highest value lies at most half a step from a time watched: each mode may miss this part of its swing.
    swing = np.minimum(np.abs(apart).max(axis=0), np.abs(answer).max(axis=0))
    missed = swing * np.minimum(1.0, (omega[taken] * step) ** 2 / 8)
    x, both = np.atleast_1d(np.asarray(xi, dtype=np.float64)), np.array([0.0, 1.0])
    out: list[Array] = []
    for places, derivative, scale in (
        (x, 0, length**4 / stiffness),
        (x, 2, length**2),
        (both, 3, length),
    ):
        # y, M and V of one mode at rest under the load 1, whose sum is the static answer
        part = (tail.participation / tail.lam**4)[:, None] * shapes(tail, places, derivative)
        whole = static_shapes(ends, places)[derivative] - asleep @ part
        if asleep[-1]:
            whole = part[taken].sum(axis=0)
        out.append(scale * np.abs(w[:, None] * whole + apart @ part[taken]).max(axis=0))
        # Beyond the last mode counted the parts fall at least as fast as 1/n².
        beyond = len(omega) * np.abs(part[-2:]).max(axis=0) * reach[-1]
        between = np.sqrt(missed**2 @ part[taken] ** 2)
        out.append(scale * (reach @ np.abs(part) + beyond + between))
    return SpanResponse(x, *out)
