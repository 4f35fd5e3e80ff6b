"""Grids in radius and time for the skin effect, and the number that says whether it matters.

Symbols and units: ``radius`` R and ``inner_radius`` a (m), ``resistivity`` ρ (ohm·m), ``tail`` τ2, the time constant of
the decay (s), ``front`` τ1, the time constant of the rise (s), ``mu_r`` relative permeability (1).

Sources: the radial grid and the steps are engineering choices, checked against the Bessel solution of the round wire
for alternating current; the diffusion of a field into a conductor: Knoepfel, Magnetic Fields (Wiley, 2000), chapter 4.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
"""An array of SI numbers."""

__all__ = [
    "MU0",
    "depth_of_front",
    "first_cell",
    "radial_faces",
    "skin_parameter",
    "surface_weights",
    "time_steps",
]

MU0 = 4e-7 * np.pi
"""Permeability of vacuum (H/m)."""

FIRST_CELL = 0.15  # of the skin depth of the front
HEAT_CELL = 0.5  # of the depth that heat diffuses during the tail
GROWTH = 0.1  # each cell is larger than the one outside it by this fraction
LEAST_CELLS = 16  # where the skin depth exceeds the wall
FRONT_STEPS = 40  # steps in τ1
FRONT_SPAN = 2.5  # the small steps last this many τ1: a Heidler front of n = 10 is over at 2
STEP_GROWTH = 0.02


def skin_parameter(
    radius: Any, resistivity: Any, tail: Any, *, mu_r: Any = 1.0, inner_radius: Any = 0.0
) -> Any:
    """Time of magnetic diffusion over the time of the decay, p = R²·μ0·μr/(ρ·τ2) (1).

    A cold wire of constant properties answers to one waveform by p alone. Below p = 0.1 the surface of a round wire
    runs less than 6 % hotter than the mean of the section, and the uniform law is enough.

    A tube takes the radius of the wire whose surface field exceeds its mean by as much while the current changes
    slowly (first term of the expansion in dt; exact for a → 0, R² = 8/3 of the squared wall for a thin one)::

        R² → 4·G/(R² − a²),   G = (R⁴ − a⁴)/4 − a²·(R² − a²) + a⁴·ln(R/a)

    Shapes: numbers or arrays; they broadcast. Leaves out: saturation (``mu_r`` is the initial one: an upper bound of
    p for steel), heating, conduction.
    """
    outer, inner = np.asarray(radius, dtype=float), np.asarray(inner_radius, dtype=float)
    x = (inner / outer) ** 2
    # In x and by a series near 1, where the closed form is a difference of near numbers.
    gap = 1 - x
    with np.errstate(divide="ignore", invalid="ignore"):
        closed = (1 - x * x) / 4 - x * gap - np.where(x > 0, x * x * np.log(x) / 2, 0.0)
        factor = np.where(gap > 1e-3, 4 * closed / gap, 2 / 3 * gap**2 * (1 + gap / 4))
    value = factor * outer**2 * MU0 * np.asarray(mu_r) / (np.asarray(resistivity) * np.asarray(tail))
    return np.asarray(value, dtype=float)[()]


def depth_of_front(resistivity: Array, front: Array, mu_r: Array) -> Array:
    """Skin depth (m) of the front: that of an alternating current of frequency 1/τ1, sqrt(ρ·τ1/(π·μ0·μr))."""
    depth: Array = np.sqrt(resistivity * front / (np.pi * MU0 * mu_r))
    return depth


def first_cell(resistivity: Array, front: Array, mu_r: Array, diffusivity: Array, tail: Array) -> Array:
    """Largest outermost cell (m): 0.15 skin depths of the front, and half the depth that heat diffuses in ``tail``.

    The second matters for steel, poor at conducting both: its surface is cooled from within by a thin layer.
    ``diffusivity`` k/C (m²/s); zero asks for nothing.
    """
    heat = np.where(diffusivity > 0, HEAT_CELL * np.sqrt(diffusivity * tail), np.inf)
    cell: Array = np.minimum(FIRST_CELL * depth_of_front(resistivity, front, mu_r), heat)
    return cell


def radial_faces(inner: float, outer: float, first: float, refine: float) -> Array:
    """Radii of the faces between the cells (m), from ``inner`` to ``outer``; the cells grow from the surface inwards.

    The outermost cell is at most ``first`` wide, each further one larger by 10 %; ``refine`` divides both.
    """
    wall = outer - inner
    growth = 1 + GROWTH / refine
    wanted = np.log1p(wall * (growth - 1) * refine / first) / np.log(growth)
    cells = int(max(np.ceil(wanted), np.ceil(LEAST_CELLS * refine)))
    inwards = np.expm1(np.arange(cells + 1) * np.log(growth))
    faces: Array = (outer - wall * inwards / inwards[-1])[::-1].copy()
    faces[0] = inner  # not zero but for rounding: a face on the axis carries no current within it
    return faces


def surface_weights(area: Array) -> Array:
    """Three weights that give the value at the surface from the means of the outermost three cells, outermost last.

    ``area`` (m²/rad) holds the areas of all cells. The derivative, at the surface, of the cubic through the integral
    of the quantity over the area: third order, and exact for what is a parabola in r².
    """
    s = np.cumsum(area[:-4:-1])
    slope = np.empty(3)
    for j in range(3):
        others = np.delete(s, j)
        slope[j] = np.prod(others / (others - s[j])) / s[j]
    # The integral up to face j holds all the cells outside it.
    weights: Array = (np.cumsum(slope[::-1])[::-1] * area[:-4:-1])[::-1].copy()
    return weights


def time_steps(front: float, end: float, refine: float) -> Array:
    """Times (s) from 0 to ``end``: steps of τ1/40 during 2.5·τ1, then each 2 % longer; ``refine`` divides both."""
    first = front / (FRONT_STEPS * refine)
    span = FRONT_SPAN * front
    if end <= span:
        return np.linspace(0.0, end, int(np.ceil(end / first)) + 1)
    early = np.linspace(0.0, span, int(np.ceil(span / first)) + 1)
    rate = STEP_GROWTH / refine
    number = int(np.ceil(np.log1p((end - span) * rate / first) / np.log1p(rate)))
    late = np.expm1(np.arange(1, number + 1) * np.log1p(rate))
    times: Array = np.concatenate([early, span + (end - span) * late / late[-1]])
    return times
