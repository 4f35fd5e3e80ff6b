"""An array of waveforms of different kinds."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, cast

import numpy as np
from numpy.typing import NDArray

from strikeenergy.lightning.sums import Waveform
from strikeenergy.units import Quantity

__all__ = ["Mixed"]


@dataclass(frozen=True, init=False, eq=False, repr=False)
class Mixed(Waveform):
    """An array of waveforms of which each element has a kind of its own."""

    parts: tuple[Waveform, ...]
    places: tuple[NDArray[np.intp], ...]
    """Flat index of each element of each part."""
    extent: tuple[int, ...]

    def __init__(self, parts: list[Waveform], places: list[NDArray[np.intp]], shape: tuple[int, ...]) -> None:
        self._set(parts=tuple(parts), places=tuple(places), extent=shape)

    @property
    def shape(self) -> tuple[int, ...]:
        """Shape of the array of waveforms."""
        return self.extent

    def __repr__(self) -> str:
        return f"Mixed({', '.join(f'{len(i)} times {p!r}' for p, i in zip(self.parts, self.places, strict=True))})"

    def __eq__(self, other: object) -> bool:
        if not isinstance(other, Mixed) or self.extent != other.extent or self.parts != other.parts:
            return False
        return all(np.array_equal(a, b) for a, b in zip(self.places, other.places, strict=True))

    __hash__ = Waveform.__hash__

    def _select(self, pick: Callable[[Any], Any], shape: tuple[int, ...]) -> Any:
        order = np.broadcast_to(np.arange(int(np.prod(self.extent))).reshape(self.extent), shape)
        wanted = np.asarray(pick(order))
        parts, places = [], []
        for part, place in zip(self.parts, self.places, strict=True):
            at = np.flatnonzero(np.isin(wanted.ravel(), place))
            if at.size:
                parts.append(part[np.searchsorted(place, wanted.ravel()[at])])
                places.append(at)
        return parts[0][0] if not wanted.ndim else Mixed(parts, places, wanted.shape)

    def _each(self, f: Callable[..., Any], t: Any = 0.0) -> Any:
        """Call f(part, its times) for each part and put the results in their places."""
        whole = np.broadcast_shapes(np.shape(t), self.extent)
        times = np.broadcast_to(t, whole).reshape(-1, int(np.prod(self.extent)))
        out = np.empty(times.shape)
        for part, place in zip(self.parts, self.places, strict=True):
            out[:, place] = f(part, times[:, place])
        return out.reshape(whole)

    def current(self, t: Quantity) -> Quantity:
        """Current at the time t (A)."""
        return cast(Quantity, self._each(lambda part, s: part.current(s), t))

    def slope(self, t: Quantity) -> Quantity:
        """Derivative of the current at the time t (A/s)."""
        return cast(Quantity, self._each(lambda part, s: part.slope(s), t))

    def charge_until(self, t: Quantity) -> Quantity:
        """Charge up to the time t (C)."""
        return cast(Quantity, self._each(lambda part, s: part.charge_until(s), t))

    @property
    def charge(self) -> Quantity:
        """∫ i dt (C)."""
        return cast(Quantity, self._each(lambda part, _: part.charge))

    @property
    def specific_energy(self) -> Quantity:
        """∫ i² dt = W/R (J/ohm)."""
        return cast(Quantity, self._each(lambda part, _: part.specific_energy))

    def _knots(self) -> NDArray[np.float64]:
        knots = [part._knots() for part in self.parts]
        out = np.empty((max(len(k) for k in knots), int(np.prod(self.extent))))
        for rows, place in zip(knots, self.places, strict=True):
            out[: len(rows), place] = rows
            out[len(rows) :, place] = rows[-1]
        return out.reshape(-1, *self.extent)

    def _crest_time(self) -> Any:
        return self._each(lambda part, _: part.peak_time)

    def _steepest(self) -> Any:
        return self._each(lambda part, _: part.steepest_time)

    def _cross(self, level: float, side: int) -> Any:
        return self._each(lambda part, _: part._rise(level) if side < 0 else part._fall(level))
