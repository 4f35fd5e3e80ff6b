"""The input: what the lightning current is.

Waveforms, strokes and flashes, named threats, statistics of natural flashes, fits, and measured records::

    from strikeenergy.lightning import Heidler, Rectangle, Stroke, Flash, threat, population, fit, read_record, reduce

The names are loaded at first use.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from strikeenergy.lightning.fitting import fit as fit
    from strikeenergy.lightning.flash import Flash as Flash
    from strikeenergy.lightning.flash import Stroke as Stroke
    from strikeenergy.lightning.populations import population as population
    from strikeenergy.lightning.record import read_record as read_record
    from strikeenergy.lightning.reduction import reduce as reduce
    from strikeenergy.lightning.threats import threat as threat
    from strikeenergy.lightning.waveform import ConcaveFront as ConcaveFront
    from strikeenergy.lightning.waveform import DoubleExponential as DoubleExponential
    from strikeenergy.lightning.waveform import Heidler as Heidler
    from strikeenergy.lightning.waveform import LinearFront as LinearFront
    from strikeenergy.lightning.waveform import PowerExponential as PowerExponential
    from strikeenergy.lightning.waveform import Rectangle as Rectangle
    from strikeenergy.lightning.waveform import Sampled as Sampled
    from strikeenergy.lightning.waveform import Sum as Sum
    from strikeenergy.lightning.waveform import Trapezoid as Trapezoid
    from strikeenergy.lightning.waveform import Triangle as Triangle
    from strikeenergy.lightning.waveform import designation as designation

_SHAPES = (
    "ConcaveFront", "DoubleExponential", "Heidler", "LinearFront", "PowerExponential", "Rectangle", "Sampled", "Sum",
    "Trapezoid", "Triangle", "designation",
)  # fmt: skip
_HOMES = {
    "Flash": "flash",
    "Stroke": "flash",
    "fit": "fitting",
    "population": "populations",
    "read_record": "record",
    "reduce": "reduction",
    "threat": "threats",
    **dict.fromkeys(_SHAPES, "waveform"),
}

__all__ = list(_HOMES)


def __getattr__(name: str) -> Any:
    if name in _HOMES:
        return getattr(import_module(f"strikeenergy.lightning.{_HOMES[name]}"), name)
    raise AttributeError(f"module 'strikeenergy.lightning' has no attribute {name!r}")


def __dir__() -> list[str]:
    return sorted(__all__)
