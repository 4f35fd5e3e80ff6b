"""Forces of whole circuits in closed form, from the gradient of the inductance: F = ½·i²·∂L/∂x at constant i.

Bends, loops, coils, tapes, tubes, and how a current divided over n conductors pulls at them. The force between round
parallel wires, on a plain corner, and the pinch pressures stand in ``magnetics``; any other geometry in ``biot_savart``.

Symbols and units: ``i2`` square of the current (A²), which gives a force or pressure, or the specific energy W/R (A²·s),
which gives its impulse; ``r`` radius of the wire (m); ``u`` 0 where the current flows at the wire's surface and 1/4
where it fills the section, a bracket of 2 to 5 %; ``d``, ``a``, ``b``, ``s``, ``t``, ``R`` lengths as stated (m);
``sigma_y`` yield strength (Pa), ``E_Y`` modulus of elasticity (Pa), ``nu`` Poisson's ratio, ``gamma`` density (kg/m³),
``J_p`` impulse per area (Pa·s). mu0 = 4e-7·π H/m. Shapes: numbers or arrays; they broadcast.

Sources: F. W. Grover, Inductance Calculations (1946); F. W. Grover and E. B. Rosa, Bulletin of the Bureau of Standards 8
(1912); H. Nagaoka (1909) and L. Lorenz (1879) for the coil; S. P. Timoshenko, Theory of Elastic Stability, for the ring
under pressure. The rest is integrated here from the law of Biot and Savart.

Validity: quasi-static; wires thin against their loops (r/side of 1/200: 0.1 to 0.5 %); flat tapes and windings as thin layers of even current.
Leaves out: crowding of the current by a near neighbour (except where stated), steel, ends, motion, plastic hardening.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from strikeenergy.note import Formula

__all__ = [
    "CIRCLE_INDUCTANCE",
    "CIRCLE_TENSION",
    "COIL_LONG_FORCE",
    "MUTUAL",
    "PARALLEL_PROXIMITY",
    "RECTANGLE_INDUCTANCE",
    "RECTANGLE_SIDE",
    "RING_BREATHING",
    "RING_BUCKLING",
    "RING_OF_N",
    "SHARED",
    "TAPES_EDGE",
    "TAPES_FACE",
    "TUBE_HOOP_THICK",
    "TUBE_HOOP_THIN",
    "TUBE_YIELD_CURRENT_THICK",
    "TUBE_YIELD_CURRENT_THIN",
    "U_CROSSBAR",
    "U_CROSSBAR_PERFECT",
    "WALL_SPEED",
    "coil_forces",
    "coil_inductance",
    "nagaoka",
    "parallel_group",
]

Array = NDArray[np.float64]

# -- pairs -------------------------------------------------------------------------------------------------

MUTUAL = Formula("mu0/(2*pi)*(l*asinh(l/d) - sqrt(l**2 + d**2) + d)")
"""Mutual inductance (H) of two equal filaments of length ``l`` that face each other at distance ``d``."""

PARALLEL_PROXIMITY = Formula("mu0*i2/(2*pi)/sqrt(d**2 - 4*r**2)")
"""Force per length (N/m) between two round wires, go and return, axes ``d`` apart, current at the surface and crowded
towards the neighbour (perfect conductors, d > 2·r). At large d/r that of filaments."""

TAPES_FACE = Formula("mu0*i2/(pi*b**2)*(b*atan(b/d) - d/2*log(1 + b**2/d**2))")
"""Force per length (N/m) between two flat tapes of width ``b``, face to face at distance ``d`` between their middle
planes; even current, no thickness. Over that of filaments: the tape factor."""

TAPES_EDGE = Formula("mu0*i2/(2*pi*b**2)*((s + b)*log(s + b) + (s - b)*log(s - b) - 2*s*log(s))")
"""Force per length (N/m) between two flat tapes of width ``b`` in one plane, centre lines ``s`` > b apart."""

# -- loops -------------------------------------------------------------------------------------------------

U_CROSSBAR = Formula("mu0*i2/(2*pi)*(log(d/r) + u)")
"""Force (N) on the crossbar of a U with long legs, axes ``d`` apart: outwards. d >> r."""

U_CROSSBAR_PERFECT = Formula("mu0*i2/(2*pi)*log(d/(2*r) + sqrt((d/(2*r))**2 - 1))")
"""U_CROSSBAR exactly, for a current at the surface of perfect conductors: arcosh(d/(2·r)) in place of ln(d/r)."""

RECTANGLE_INDUCTANCE = Formula(
    "mu0/pi*(a*log(2*a/r) + b*log(2*b/r) - a*asinh(a/b) - b*asinh(b/a) + 2*sqrt(a**2 + b**2) - 2*(a + b) + u*(a + b))"
)
"""Inductance (H) of a rectangle a × b of round wire. Grover (1946)."""

RECTANGLE_SIDE = Formula("mu0*i2/(2*pi)*(log(2*a/r) - 1 - asinh(a/b) + sqrt(a**2 + b**2)/a + u)")
"""Force (N), outwards, on one side of length ``b`` of a rectangle; its twin is ``a`` away. ½·i²·∂L/∂a."""

CIRCLE_INDUCTANCE = Formula("mu0*R*(log(8*R/r) - 2 + u)")
"""Inductance (H) of a ring of radius ``R`` of round wire."""

CIRCLE_TENSION = Formula("mu0*i2/(4*pi)*(log(8*R/r) - 1 + u)")
"""Tension (N) in a ring of round wire: ½·i²·∂L/∂R over 2·π. The outward load per length is this over R."""

COIL_LONG_FORCE = Formula("mu0*n**2*i2*pi*R**2/(2*l**2)")
"""Axial compression (N) of a coil by the long-coil field, B²·A/(2·mu0): up to twice too high for a short one."""


def _elliptic(radius: ArrayLike, length: ArrayLike) -> tuple[Array, Array, Array]:
    """Return k, h(k) and dh/dk of L = (8/3)·mu0·N²·R³/l²·h, with h = ((2k² − 1)·E + (1 − k²)·K)/k³ − 1.

    With D = (K − E)/k² (Carlson's R_D over 3) it is h = (K + (1 − 2k²)·D)/k − 1 and h' = −3·D/k²: exact for long coils;
    in short ones h loses about 1e-16·(2R/l)².
    """
    from scipy.special import ellipkm1, elliprd

    diameter, length = 2 * np.asarray(radius, dtype=np.float64), np.asarray(length, dtype=np.float64)
    square = diameter**2 + length**2
    k, rest = diameter / np.sqrt(square), length**2 / square
    big_d = elliprd(0.0, rest, 1.0) / 3
    return k, (ellipkm1(rest) + (1 - 2 * k**2) * big_d) / k - 1, -3 * big_d / k**2


def nagaoka(ratio: ArrayLike) -> Any:
    """Nagaoka's factor (1) of a cylindrical layer of current; ``ratio`` is diameter over length. 1 for a long coil."""
    x = np.asarray(ratio, dtype=np.float64)
    _, h, _ = _elliptic(x / 2, 1.0)
    return (8 / (3 * np.pi) * (x / 2) * h)[()]


def coil_inductance(n: ArrayLike, radius: ArrayLike, length: ArrayLike) -> Any:
    """Inductance (H) of a coil of ``n`` turns: L = mu0·n²·π·R²/l·K(2R/l). A thin layer: no wire radius, no pitch."""
    r, long = np.asarray(radius, dtype=np.float64), np.asarray(length, dtype=np.float64)
    return (4e-7 * np.pi * np.asarray(n) ** 2 * np.pi * r**2 / long * nagaoka(2 * r / long))[()]


def coil_forces(n: ArrayLike, radius: ArrayLike, length: ArrayLike, i2: ArrayLike = 1.0) -> tuple[Any, Any]:
    """Axial force and hoop tension of a coil or helix (N): ½·i²·∂L/∂l (negative: it shortens) and ½·i²·∂L/∂R/(2π·n).

    Args:
        n: turns.
        radius: of the winding (m).
        length: of the winding (m).
        i2: square of the current (A²), or W/R (A²·s).

    A thin layer: a helix of few turns and wide pitch feels, besides, the forces of its wire upon itself.
    """
    r, long = np.asarray(radius, dtype=np.float64), np.asarray(length, dtype=np.float64)
    k, h, slope = _elliptic(r, long)
    square = 4 * r**2 + long**2
    scale = 8 / 3 * 4e-7 * np.pi * np.asarray(n) ** 2 * r**3 / long**2
    by_length = scale * (-2 * h / long - slope * k * long / square)
    by_radius = scale * (3 * h / r + slope * 2 * long**2 / square**1.5)
    half = np.asarray(i2) / 2
    return (half * by_length)[()], (half * by_radius / (2 * np.pi * np.asarray(n)))[()]


# -- tubes -------------------------------------------------------------------------------------------------

TUBE_HOOP_THICK = Formula("mu0*i2/(2*pi**2*(b**2 - a**2)**2)*((b**3 - a**3)/3 - a**2*(b - a))/(b - a)")
"""Mean compressive hoop stress (Pa) in a tube of inner radius ``a`` and outer radius ``b`` that the current fills:
the body force J·B integrated over the wall, divided by it."""

TUBE_HOOP_THIN = Formula("mu0*i2/(8*pi**2*b**2)*(b - t/2)/t")
"""Compressive hoop stress (Pa) of a thin wall ``t``: the pinch pressure at the outer radius ``b`` on the mean radius."""

TUBE_YIELD_CURRENT_THICK = Formula(
    "sqrt(sigma_y*2*pi**2*(b**2 - a**2)**2*(b - a)/(mu0*((b**3 - a**3)/3 - a**2*(b - a))))"
)
"""Current (A) at which TUBE_HOOP_THICK reaches the yield strength."""

TUBE_YIELD_CURRENT_THIN = Formula("sqrt(sigma_y*t*8*pi**2*b**2/(mu0*(b - t/2)))")
"""Current (A) at which TUBE_HOOP_THIN reaches the yield strength. Static: a heated wall yields earlier, and a peak that
is shorter than the ring's period crushes less."""

RING_BUCKLING = Formula("E_Y*t**3/(4*(1 - nu**2)*R**3)")
"""Pressure (Pa) at which a long tube of mean radius ``R`` and wall ``t`` buckles elastically into an oval. Timoshenko."""

RING_BREATHING = Formula("sqrt(E_Y/gamma)/(2*pi*R)")
"""Frequency (Hz) at which a ring of mean radius ``R`` breathes: pulses longer than its period act quasi-statically."""

WALL_SPEED = Formula("J_p/(gamma*t)")
"""Speed (m/s) of a free wall after an impulse per area ``J_p``: that of PINCH_SURFACE (``magnetics``) with i² = W/R."""

# -- one current in n conductors ---------------------------------------------------------------------------

SHARED = Formula("i2/n**2")
"""The product of two currents (A², or W/R in A²·s) where each is one n-th of the whole: pair forces fall with 1/n²."""

RING_OF_N = Formula("mu0*i2*(n - 1)/(4*pi*n**2*R)")
"""Force per length (N/m), inwards, on each of ``n`` equal parallel conductors spaced evenly on a circle of radius ``R``
that share the current. For many it is the pinch of a thin tube."""


def parallel_group(positions: ArrayLike, shares: ArrayLike, i2: float = 1.0) -> Array:
    """Net force per length (n, 2), N/m, on each of n long parallel conductors that carry shares of one current.

    Args:
        positions: of the axes in the plane across them (n, 2), m.
        shares: of the common current (n,); negative for a return.
        i2: square of the common current (A²), or W/R (A²·s).

    Raises:
        ValueError: two conductors stand in the same place.
    """
    p, k = np.asarray(positions, dtype=np.float64), np.asarray(shares, dtype=np.float64)
    apart = p[None] - p[:, None]
    square = np.einsum("ijk,ijk->ij", apart, apart)
    np.fill_diagonal(square, np.inf)
    if not (square > 0).all():
        raise ValueError("two conductors of the group stand in the same place")
    return np.asarray(2e-7 * i2 * k[:, None] * np.einsum("ij,ijk->ik", k[None] / square, apart))
