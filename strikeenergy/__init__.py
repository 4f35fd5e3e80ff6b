"""strikeenergy: what a lightning current does to the thing it strikes, in numbers that can be checked.

>>> import strikeenergy
>>> result = strikeenergy.estimate(strikeenergy.load_case("cases/boathouse.toml"))  # doctest: +SKIP

The names below are loaded at first use, so that ``import strikeenergy`` costs next to nothing.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

from strikeenergy.version import __version__

if TYPE_CHECKING:
    from strikeenergy.case import Case as Case
    from strikeenergy.case import load_case as load_case
    from strikeenergy.case import make_case as make_case
    from strikeenergy.engine import estimate as estimate
    from strikeenergy.lightning.flash import Flash as Flash
    from strikeenergy.lightning.flash import Stroke as Stroke
    from strikeenergy.lightning.threats import threat as threat
    from strikeenergy.results import Estimate as Estimate
    from strikeenergy.units import quantity as quantity

_HOMES = {
    "Case": "strikeenergy.case",
    "load_case": "strikeenergy.case",
    "make_case": "strikeenergy.case",
    "estimate": "strikeenergy.engine",
    "Flash": "strikeenergy.lightning.flash",
    "Stroke": "strikeenergy.lightning.flash",
    "threat": "strikeenergy.lightning.threats",
    "Estimate": "strikeenergy.results",
    "quantity": "strikeenergy.units",
}

__all__ = ["__version__", *_HOMES]


def __getattr__(name: str) -> Any:
    if name in _HOMES:
        return getattr(import_module(_HOMES[name]), name)
    raise AttributeError(f"module 'strikeenergy' has no attribute {name!r}")


def __dir__() -> list[str]:
    return sorted(__all__)
