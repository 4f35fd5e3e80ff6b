"""Magnetic forces between and within straight conductors.

All are quasi-static: the force at an instant follows the current at that instant, so it scales with i², and its time
integral with ∫ i² dt = W/R. In each formula ``i2`` is therefore either the product of the two currents (A²), which
gives a force, or the product of the shares times the specific energy W/R (A²·s), which gives its impulse.

mu0 = 4e-7·π H/m. Shapes: numbers or arrays; they broadcast.

Leaves out: nearby steel, eddy currents in nearby metal, the motion of the conductors (a span that moves answers to the
impulse, not to the peak), and the return of a circuit that is not closed.
"""

from __future__ import annotations

from strikeenergy.note import Formula

__all__ = [
    "BEND",
    "BEND_CUTOFF_UNIFORM",
    "BEND_PER_LENGTH",
    "PARALLEL_FINITE",
    "PARALLEL_PER_LENGTH",
    "PINCH_AXIS",
    "PINCH_SURFACE",
]

PARALLEL_PER_LENGTH = Formula("mu0*i2/(2*pi*d)")
"""Force per length (N/m) between two infinitely long parallel filaments at distance ``d`` (m).

Exact for round wires with axisymmetric current at any radius. IEC 62305-1:2010 Annex D.4.2 writes it per length l.
"""

PARALLEL_FINITE = Formula("mu0*i2/(2*pi*d)*(sqrt(l**2 + d**2) - d)")
"""Force (N) between two equal filaments of length ``l`` that face each other at distance ``d`` (m).

Follows from the mutual inductance of two parallel segments, F = i1·i2·dM/dd.
"""

BEND_PER_LENGTH = Formula("mu0*i2/(4*pi*x)*l/sqrt(l**2 + x**2)")
"""Force per length (N/m) at distance ``x`` from a right-angle corner whose other leg is ``l`` long (Biot-Savart).

The configuration of IEC 62305-1:2010 Annex D.4.2. Directed away from the other leg.
"""

BEND = Formula("mu0*i2/(4*pi)*log(x2/x1*(l + sqrt(l**2 + x1**2))/(l + sqrt(l**2 + x2**2)))")
"""Force (N) on one leg of a right-angle corner between ``x1`` and ``x2``: the integral of BEND_PER_LENGTH.

A filament's force grows without limit towards the corner; a wire of radius r is met by starting at x1 = r for a
current at the surface, and at x1 = r·exp(−1/4) for a current spread over the section.
"""

BEND_CUTOFF_UNIFORM = Formula("r*exp(-0.25)")
"""Where to start BEND for a current spread evenly over a round section (m)."""

PINCH_SURFACE = Formula("mu0*i2/(8*pi**2*r**2)")
"""Magnetic pressure (Pa) on the surface of a round conductor or tube of outer radius ``r`` that carries its current
at the surface: B²/(2·mu0) with B = mu0·i/(2·π·r)."""

PINCH_AXIS = Formula("mu0*i2/(4*pi**2*r**2)")
"""Pressure (Pa) on the axis of a solid round conductor with the current spread evenly: twice PINCH_SURFACE."""
