"""The channel of a flash: how long it is, and what energy a charge and a metre of channel stand for.

::

    L = H·(H/eps)^(D − 1)        E = e·L        E = Q·V   or   Q·V/2

Symbols and units: ``H`` straight height that the channel spans (m), ``eps`` ruler (m), ``D`` fractal dimension (1),
``l`` length of the channel (m), ``e`` energy per metre of channel (J/m), ``Q`` charge (C), ``V`` voltage (V), ``E``
energy that goes into an object and ``E_f`` that of the whole flash (J).

A fractal has no length of its own: the length grows as the ruler shrinks, so **a dimension is never stated without its
ruler**. A dimension of about 1.34 belongs to the branched pattern on photographs; put on the main path with a ruler of
a metre it gives fifteen times the height, which no channel has.

Leaves out: the branches where the dimension is that of the main path, the part of the channel in the cloud, the change
of the energy per metre along the channel and from stroke to stroke.
Valid: 1 ≤ D < 2 and 0 < eps ≤ H. The energies are bookkeeping of the whole flash; they say nothing about a struck object,
which takes what its own resistance makes of W/R and its own voltage drop of the charge.

Sources: elementary (definition of the divider dimension; electrostatics).
Shapes: every argument may be a number or an array; they broadcast.
"""

from __future__ import annotations

from strikeenergy.note import Formula

__all__ = ["ENERGY", "ENERGY_DISCHARGED", "ENERGY_FALLEN", "LENGTH", "SHARE"]

LENGTH = Formula("H*(H/eps)**(D - 1)")
"""Length (m) of the channel as a ruler ``eps`` measures it: the number of rulers (H/eps)^D, times the ruler."""

ENERGY = Formula("e*l")
"""Energy (J) of a channel of length ``l``, with the same energy in every metre."""

ENERGY_FALLEN = Formula("Q*V")
"""Electrostatic energy (J) of a charge that falls through a voltage which it does not change: an upper bound for a flash."""

ENERGY_DISCHARGED = Formula("Q*V/2")
"""Electrostatic energy (J) of a charge that falls through its own voltage, which goes to zero with it."""

SHARE = Formula("E/E_f")
"""Share (1) of the energy of the flash that goes into an object."""
