"""What a published set of lightning statistics consists of: its quantities, a law with its origin, continuing currents."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from strikeenergy.lightning.marginals import Marginal
from strikeenergy.sources import Constant, Source, Standing

__all__ = ["COMPONENTS", "QUANTITIES", "ContinuingCurrent", "PublishedLaw"]

COMPONENTS = ("positive", "first negative", "subsequent")
"""Sorts of stroke; where a quantity belongs to the flash, ``first negative`` means the negative flash."""

QUANTITIES: dict[str, tuple[str, str, str]] = {
    "peak": ("A", "kA", "peak current"),
    "charge": ("C", "C", "charge of the flash"),
    "short_charge": ("C", "C", "charge of the short stroke"),
    "specific_energy": ("J/ohm", "kJ/ohm", "specific energy W/R"),
    "initial_peak": ("A", "kA", "first peak of the current"),
    "max_steepness": ("A/s", "kA/µs", "greatest steepness"),
    "steepness_30_90": ("A/s", "kA/µs", "mean steepness between 30 % and 90 %"),
    "steepness_10_90": ("A/s", "kA/µs", "mean steepness between 10 % and 90 %"),
    "front_duration": ("s", "µs", "duration of the front"),
    "front_10_90": ("s", "µs", "time from 10 % to 90 % of the peak, over 0.8"),
    "front_30_90": ("s", "µs", "time from 30 % to 90 % of the peak, over 0.6"),
    "stroke_duration": ("s", "µs", "time to half value"),
    "interval": ("s", "ms", "time between strokes"),
    "flash_duration": ("s", "ms", "duration of the flash"),
}
"""Name, SI unit, unit to show and meaning of every quantity that a set may have a law of."""


@dataclass(frozen=True)
class PublishedLaw:
    """A law with its origin.

    Attributes:
        law: in SI.
        points: value (SI) that a share of the observations exceeds, by the column's name (``p95``, ``p50``,
            ``p5``).
        source: where it stands.
        standing: how firmly.
        note: what was done to it (``"1.5 times that of ..."``).
    """

    law: Marginal
    points: Mapping[str, float]
    source: Source
    standing: Standing
    note: str = ""


@dataclass(frozen=True)
class ContinuingCurrent:
    """Share of flashes with a long continuing current, how long it lasts, and what it does not go with.

    Attributes:
        name: of the set of shares.
        share: by component, share of flashes with one (1).
        excess: by component, mean time (s) beyond ``duration``, exponentially distributed.
        peak: negative strokes above this peak (A) are not followed by one (highly unlikely: here, never).
        duration: what counts as long (s).
    """

    name: str
    share: Mapping[str, Constant]
    excess: Mapping[str, Constant]
    peak: Constant
    duration: Constant
