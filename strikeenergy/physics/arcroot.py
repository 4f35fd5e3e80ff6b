"""What an arc root and the current that spreads from it do to a metal sheet: closed-form bounds.

Symbols and units: ``u`` anode or cathode drop (V), ``Q`` charge (C), ``gamma`` density (kg/m³), ``c`` specific heat
(J/(kg·K)), ``L`` latent heat of melting (J/kg), ``T_m`` melting and ``T_0`` starting temperature (K), ``s`` specific action
to the melting point (A²·s/m⁴), ``d`` thickness (m).

Leaves out: conduction of heat into the sheet, evaporation, splashing, motion of the root. The volume is therefore an
upper bound and never a hole: for 4 mm steel it is about seven times what a solution with heat conduction melts.
"""

from __future__ import annotations

from strikeenergy.note import Formula

__all__ = ["MELTED_VOLUME_BOUND", "ROOT_ENERGY", "SPREAD_MELT_RADIUS"]

MELTED_VOLUME_BOUND = Formula("u*Q/gamma/(c*(T_m - T_0) + L)")
"""Upper bound of the melted volume (m³): all the energy of the drop goes into melting. IEC 62305-1:2010 Annex D.4.1.2."""

ROOT_ENERGY = Formula("u*Q")
"""Energy (J) that the drop brings to the arc root."""

SPREAD_MELT_RADIUS = Formula("sqrt(w/(4*pi**2*d**2*s))")
"""Radius (m) within which a current that spreads radially through the full thickness melts the sheet by Joule heat
alone: J = I/(2·π·r·d), adiabatic, so that the specific action at r is W/(2·π·r·d)²."""
