"""How strong lightning is, statistically: named populations, possible random flashes, rarity of a value.

``population()`` is the mixture of IEC 62305-1 Annex A (10 % positive, 90 % negative flashes), other sets go
by name. Units: SI throughout (A, C, J/ohm, s, A/s); charge is that of the whole flash unless it says
short-stroke. Polarity is +1 or -1, all other quantities are magnitudes.

``exceedance`` and ``quantile`` are those of the published laws. ``sample`` draws peak, charge and W/R
together and keeps what a current can be (W/R <= I·Q), so its marginals differ a little from the published
ones: the median of W/R of positive flashes falls from 612 to about 580 kJ/ohm.

Leaves out: waveforms and times of the sampled flashes, the charge carried by the continuing current (it is
not tied to the flash charge), any dependence between the number of strokes and the rest beyond the joint law
of continuing currents, differences between years and sites other than the named alternatives.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from typing import Any, Literal, cast

from strikeenergy.errors import UnknownName
from strikeenergy.lightning.joint import Correlation
from strikeenergy.lightning.population_set import Population, Rarity, Sample
from strikeenergy.lightning.population_table import (
    population_aliases,
    population_names,
    read_continuing,
    read_population,
    read_strokes,
)
from strikeenergy.lightning.published_laws import COMPONENTS, QUANTITIES, ContinuingCurrent, PublishedLaw
from strikeenergy.sources import Constant, Source, Standing

__all__ = [
    "COMPONENTS",
    "DEFAULT",
    "QUANTITIES",
    "ContinuingCurrent",
    "Population",
    "PublishedLaw",
    "Rarity",
    "Sample",
    "population",
    "population_names",
    "rarity",
]

DEFAULT = "IEC 62305-1"


def population(
    name: str = DEFAULT,
    *,
    positive_share: float | None = None,
    correlation: Correlation | None = None,
    strokes: str | None = None,
    continuing: str | None = None,
    bound: Literal["flash", "short"] = "flash",
) -> Population:
    """Return a named population, with choices of one's own where given.

    Args:
        name: one of :func:`population_names`, or another name of it (``"IEC"``, ``"upward"``).
        positive_share: share of positive flashes.
        correlation: of peak, charge and W/R.
        strokes: set of stroke numbers (``"CIGRE TB 549"``, ``"Poelman 2021"``).
        continuing: set of continuing-current shares (``"LS1989"``, ``"Saba 2010"``: shares counted in field
            observations).
        bound: the charge in W/R <= I·Q, see :class:`JointLaw`.

    Raises:
        UnknownName: no such population or set, with the nearest names.
        InputError: impossible parameters.
    """
    spelt = population_aliases()
    known = {alias.casefold(): n for alias, n in spelt.items()}
    if name.casefold() not in known:
        raise UnknownName("population", name, spelt)
    made, changes = read_population(known[name.casefold()]), cast(dict[str, Any], {})
    if positive_share is not None:
        given = Source("given", "Given by the user")
        changes["positive_share"] = Constant(
            positive_share, "", given, Standing.GIVEN, "share of positive flashes"
        )
    if correlation is not None:
        changes["correlation"] = correlation
    if strokes is not None:
        changes["strokes"], changes["stroke_means"] = read_strokes(strokes)
    if continuing is not None:
        changes["continuing"] = read_continuing(continuing)
    if bound != made.bound:
        changes["bound"] = bound
    return replace(made, **changes) if changes else made


def rarity(values: Mapping[str, float], of: Population | str = DEFAULT) -> tuple[Rarity, ...]:
    """Say how rare each of several values (SI, by quantity) is. See :meth:`Population.rarity`."""
    return (population(of) if isinstance(of, str) else of).rarity(values)
