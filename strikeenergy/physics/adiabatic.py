"""Adiabatic Joule heating of a conductor by a current pulse, with a resistivity linear in temperature.

The law of IEC 62305-1:2010 Annex D.4 (and, with other constants, of IEC 60949, IEC 60364-5-54 and IEEE 80)::

    γ·c·dθ = ρ(θ)·j²·dt,    ρ(θ) = ρ0·(1 + α·(θ − θ0))
    θ − θ0 = (exp(W·α·ρ0/(q²·γ·c)) − 1)/α,    W = ∫ i² dt = W/R

Symbols and units: ``w`` specific energy (J/ohm), ``q`` section (m²), ``rho0`` resistivity at the *starting* temperature
(ohm·m), ``alpha`` temperature coefficient *at the starting temperature* (1/K), ``C`` heat capacity per volume γ·c
(J/(m³·K)), ``rise`` in K, ``density`` (kg/m³), ``latent`` heat of melting (J/kg).

Leaves out: heat loss, skin effect, thermal expansion, the change of γ·c with temperature, joints.
Valid: solid metal below its melting point; pulses so short that no heat leaves (lightning currents in sections of
millimetres); sections that the current fills (for fast fronts in thick conductors the surface runs hotter).

Shapes: every argument may be a number or an array; they broadcast.
"""

from __future__ import annotations

from strikeenergy.note import Formula

__all__ = [
    "ACTION_TO",
    "COEFFICIENT_AT",
    "ENERGY_FULL",
    "ENERGY_ONSET",
    "HEAT_PER_VOLUME",
    "HEAT_STORED",
    "MELTED_FRACTION",
    "RESISTANCE",
    "RESISTIVITY_AT",
    "RISE",
    "RISE_CONSTANT",
    "SECTION_FOR",
]

HEAT_PER_VOLUME = Formula("gamma*c")
"""Heat capacity per volume (J/(m³·K)) of a density (kg/m³) and a specific heat (J/(kg·K))."""

RESISTIVITY_AT = Formula("rho_r*(1 + alpha_r*(T - T_r))")
"""Resistivity (ohm·m) at temperature ``T`` (K), from its value at the reference temperature ``T_r`` (K)."""

COEFFICIENT_AT = Formula("alpha_r/(1 + alpha_r*(T - T_r))")
"""Temperature coefficient (1/K) referred to temperature ``T``: the same straight line, seen from there."""

RISE = Formula("expm1(w*alpha*rho0/(q**2*C))/alpha")
"""Temperature rise (K). IEC 62305-1:2010 Annex D.4. The reference temperature of ``rho0`` and ``alpha`` is the start."""

RISE_CONSTANT = Formula("w*rho0/(q**2*C)")
"""Temperature rise (K) where the resistivity does not change with temperature: the limit of RISE for alpha → 0."""

ACTION_TO = Formula("C*log1p(alpha*rise)/(alpha*rho0)")
"""Specific action W/q² (A²·s/m⁴) that raises the temperature by ``rise``: the inverse of RISE."""

ACTION_TO_CONSTANT = Formula("C*rise/rho0")
"""ACTION_TO for alpha → 0."""

ENERGY_ONSET = Formula("s*q**2")
"""Specific energy (J/ohm) at which melting begins, from the specific action ``s`` to the melting point."""

ENERGY_FULL = Formula("W_on + q**2*gamma*L/rho_m")
"""Specific energy (J/ohm) at which all is molten: the latent heat taken up at the solid's resistivity at melting."""

MELTED_FRACTION = Formula("minimum(maximum((w - W_on)/(W_full - W_on), 0), 1)")
"""Melted fraction of the section (1), between the onset and the end of melting."""

SECTION_FOR = Formula("sqrt(w/s)")
"""Section (m²) that is just brought to the end of the specific action ``s`` by the specific energy ``w``."""

RESISTANCE = Formula("rho0*l/q")
"""Resistance (ohm) of a length ``l`` (m) at the starting temperature."""

HEAT_STORED = Formula("q*l*(C*rise + f*gamma*L)")
"""Heat (J) in a length ``l``: the sensible heat of ``rise`` and the latent heat of the melted fraction ``f``."""

HEAT_STORED_SOLID = Formula("q*l*C*rise")
"""HEAT_STORED of a conductor that stays solid."""
