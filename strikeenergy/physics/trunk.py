"""A living trunk in the path of a stroke: layers in parallel, a capped field, and an arc that does the damage.

A trunk is a resistor of some hundred to some thousand ohms per metre only until its field reaches that at
which bark, air or wet wood break down. That happens at about 0.1 to 1 kA, in the first microsecond. From
then on an arc carries the current, on the bark, under it or deep in the wood, and what that arc gives off
while it is shut in does the damage. **The whole stroke current through the resistance of the trunk is never
a model**: it gives tens of megajoules and of megavolts per metre. Every internal field here goes through
:data:`INTERNAL_FIELD`, which is capped.

Symbols and units: ``r_o``, ``r_i`` outer and inner radius of a layer (m), ``A`` area (m²), ``rho``
resistivity along the grain (ohm·m), ``k`` its factor for temperature (1), ``g`` conductance of one metre
(S·m), ``r`` resistance per metre (ohm/m), ``E_fo`` breakdown field (V/m), ``E_int`` that inside and
``E_surf`` that along the surface, ``i`` current (A), ``S`` front steepness (A/s), ``Q`` charge (C) and
``W`` specific energy W/R (J/ohm) of an impulse, ``E_ch`` field (V/m) and ``r_ch`` resistance (ohm/m) of a
confined channel, ``w`` energy per metre of trunk (J/m), ``eta`` mechanical yield (1), ``G`` fracture energy
(J/m²), ``m`` mass per metre (kg/m), ``v`` speed (m/s), ``G_b`` basic specific gravity (1), ``M`` moisture
content over oven-dry mass (1), ``T`` temperature (K).

Sources: layers in parallel, the capped field and the energy of fracture and flight are elementary physics;
the temperature law is measured on green radiata pine sapwood (along the grain, 23 to 90 °C); green density
is that of the Wood Handbook (FPL-GTR-282, chapter 4). The law of the path, the channel energy and the class
rule are engineering closures without a calibration: their coefficients are assumptions, and whoever uses
them shows the band.

Validity: living stems above freezing; impulses (about a millisecond and less). A continuing current flows
after the bark has opened and is never put into :data:`CHANNEL_ENERGY`.

Leaves out: the crown and the roots, branches, steam pressure in the tissue, the growth of cracks, air drag
on what flies.

Shapes: every argument may be a number or an array; they broadcast.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from strikeenergy.note import Formula

__all__ = [
    "BARK_THICKNESS",
    "CHANNEL_ENERGY",
    "CHANNEL_ENERGY_LIMITED",
    "CLASSES",
    "CONDUCTANCE",
    "CONDUCTANCE_OF",
    "EJECTION_ENERGY",
    "EJECTION_SPEED",
    "ENERGY_DURING_LAG",
    "ENERGY_ON_FRONT",
    "FLASHOVER_CURRENT",
    "FLASHOVER_TIME",
    "GREEN_DENSITY",
    "INTERNAL_FIELD",
    "LAYER_AREA",
    "PROBABILITY_INTERNAL",
    "RESISTANCE",
    "SHARE",
    "SLAB_MASS",
    "STRIP_MASS",
    "TEMPERATURE_FACTOR",
    "TRUNK_MASS",
    "severity",
]

# -- the trunk as a resistor, until it flashes over --------------------------------------------------------

BARK_THICKNESS = Formula("t_0 + k_b*D")
"""Bark thickness (m, one side) from the diameter over bark at breast height ``D`` (m): a species' factor and intercept."""

LAYER_AREA = Formula("pi*(r_o**2 - r_i**2)")
"""Cross-section (m²) of one layer."""

TEMPERATURE_FACTOR = Formula("(1 + alpha*(T_r - T_m))/(1 + alpha*(minimum(maximum(T, T_lo), T_hi) - T_m))")
"""Resistivity at temperature ``T`` over that at ``T_r``: a conductivity linear in temperature, ``alpha`` (1/K) referred to
``T_m``. Measured from 23 to 90 °C; carried on down to 0 °C, where it is on the high side; held at ``T_lo`` and ``T_hi``
beyond. Frozen wood conducts much worse than this."""

CONDUCTANCE_OF = Formula("A/(rho*k)")
"""Conductance (S·m) of one metre of one layer, along the grain."""

CONDUCTANCE = Formula("g_b + g_p + g_s + g_h")
"""Conductance (S·m) of one metre of trunk: bark, phloem with cambium, sapwood, heartwood in parallel."""

RESISTANCE = Formula("1/g")
"""Resistance per metre of trunk (ohm/m). Skin effect plays no part: the skin depth in wood is metres."""

SHARE = Formula("g_k*r")
"""Fraction of the current (1) that one layer carries before the flashover."""

INTERNAL_FIELD = Formula("minimum(r*i, E_fo)")
"""Field along the trunk (V/m): ohmic, and never above the breakdown field of the weakest path."""

FLASHOVER_CURRENT = Formula("E_fo/r")
"""Current in the tissue (A) at which the trunk flashes over; the tissue never carries more."""

FLASHOVER_TIME = Formula("i_fo/S")
"""Time (s) that a front of steepness ``S`` takes to the flashover current."""

ENERGY_ON_FRONT = Formula("E_fo**2*t_fo/(3*r)")
"""Heat per metre of trunk (J/m) on a linear front up to the flashover."""

ENERGY_DURING_LAG = Formula("E**2*h/(u*r)")
"""Heat per metre of trunk (J/m) while a leader of speed ``u`` (m/s) runs along the height ``h`` (m), the field held at ``E``."""

# -- the arc -----------------------------------------------------------------------------------------------

PROBABILITY_INTERNAL = Formula("1/(1 + (E_int/E_surf)**n)")
"""Probability (1) that the arc forms inside. A closure: one half where both paths are equally strong; ``n`` is not calibrated."""

CHANNEL_ENERGY = Formula("E_ch*Q + r_ch*W")
"""Energy per metre (J/m) that a confined channel takes from one impulse. Charge and W/R of the impulse only: bark opens
within about half a millisecond, and what flows later burns in the open."""

CHANNEL_ENERGY_LIMITED = Formula("minimum(E_ch*Q + r_ch*W, U/h)")
"""CHANNEL_ENERGY, limited so that the trunk of height ``h`` takes no more than the energy ``U`` (J) of a whole flash."""

# -- what flies --------------------------------------------------------------------------------------------

GREEN_DENSITY = Formula("rho_w*G_b*(1 + M)")
"""Density of green wood (kg/m³). Wood Handbook, FPL-GTR-282 chapter 4."""

STRIP_MASS = Formula("rho_b*t_b*b")
"""Mass per metre (kg/m) of a bark strip of thickness ``t_b`` and width ``b`` (m)."""

SLAB_MASS = Formula("(rho_s*d + rho_b*t_b)*b")
"""Mass per metre (kg/m) of a slab of sapwood of depth ``d`` and width ``b`` (m) with the bark on it."""

TRUNK_MASS = Formula("rho_b*A_b + rho_s*(A_p + A_s) + rho_h*A_h")
"""Mass per metre (kg/m) of the whole trunk; the phloem at the density of the sapwood."""

EJECTION_ENERGY = Formula("G*A + m*v**2/2")
"""Mechanical energy per metre (J/m) that tears a fracture area ``A`` (m² per metre) and throws ``m`` at ``v``."""

EJECTION_SPEED = Formula("minimum(sqrt(2*(maximum(eta*w, G*A) - G*A)/m), v_max)")
"""Speed (m/s) of what is thrown: the inverse of EJECTION_ENERGY, zero below the fracture energy. Above the ceiling
``v_max`` more material is taken along instead of the same material going faster."""

CLASSES = ("none visible", "bark loss", "wood loss", "explosive")
"""Damage classes, from the least; ``bark loss`` to ``explosive`` are those of the field survey of Mäkelä et al. 2009."""


def severity(
    w: Any,
    eta: Any,
    *,
    deep: bool,
    bark: Any,
    slab: Any,
    wood_loss: Any,
    split: Any,
    trunk: Any,
) -> np.ndarray[Any, np.dtype[np.int8]]:
    """Return the damage class of an internal arc, as an index into :data:`CLASSES`. A surface arc is always 0.

    Bark loss where the mechanical energy exceeds that of tearing a bark strip off; wood loss where it throws a slab
    and the channel energy is not below ``wood_loss``, or where a deep arc can split the trunk; explosive where a deep arc
    throws the whole trunk. The class never falls when ``w`` or ``eta`` rises.

    Args:
        w: channel energy per metre (J/m).
        eta: mechanical yield (1).
        deep: whether the arc is deep in the wood, or else under the bark.
        bark, slab, split, trunk: mechanical energies per metre (J/m) of these four, see EJECTION_ENERGY.
        wood_loss: least channel energy per metre (J/m) for wood loss.
    """
    mechanical = np.asarray(eta * w)
    lost = (mechanical >= slab) & (np.asarray(w) >= wood_loss)
    if deep:
        lost = lost | (mechanical >= split)
    found = np.where(mechanical > bark, 1, 0)
    found = np.where(lost, 2, found)
    if deep:
        found = np.where(mechanical >= trunk, 3, found)
    return found.astype(np.int8)
