"""Many scenarios of the skin effect on one level of refinement: their grids, their currents, and what comes back.

Between ``skin``, which asks and judges, and ``skin_march``, which holds the scheme. Symbols, units, sources, validity and
what is left out stand in ``skin``. Arrays have one axis of scenarios, the last; times, radii and the like come before.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
from numpy.typing import NDArray

from strikeenergy.physics.skin_grid import MU0, Array, first_cell, radial_faces, time_steps
from strikeenergy.physics.skin_march import GAMMA, Block, History, March, stage_quadrature

__all__ = ["Run"]

BLOCK = 128  # scenarios marched together: their arrays then stay in the cache
PROFILE_POINTS = 81
RUNAWAY = 80.0  # ln of the growth of ρ in the uniform law above which the conductor is taken to be gone
_MATERIAL = ("resistivity", "coefficient", "heat_capacity", "conductivity", "mu_r", "saturation")


class Run:
    """One grid for every scenario, marched block by block. The arguments are those of ``skin_heating``, one axis of scenarios each."""

    def __init__(
        self,
        current: Callable[[Array], Any],
        v: dict[str, Array],
        law: Callable[[Array], Array] | None,
        shape: tuple[int, ...],
        own: Array | None,
        refine: float,
        asked: Array,
    ) -> None:
        self.times = self._times(v, own, refine)
        steps = np.diff(self.times, axis=0)
        self.peak_at, between = (
            self._current(current, t, shape) for t in (self.times, self.times[:-1] + GAMMA * steps)
        )
        square = stage_quadrature(self.peak_at[:-1] ** 2, between**2, self.peak_at[1:] ** 2)
        self.energy = (square * steps).sum(axis=0)
        section = np.pi * (v["radius"] ** 2 - v["inner_radius"] ** 2)
        self.heating = self.energy * v["resistivity"] / (section**2 * v["heat_capacity"])
        # A conductor that is gone would overflow; it is marched without current and its rises said to be infinite.
        self.gone = (self.heating * v["coefficient"] > RUNAWAY) & (law is None)
        peak = np.where(self.gone, 0.0, self.peak_at)
        between = np.where(self.gone, 0.0, between)
        self.faces = self._faces(v, refine)
        number = len(v["radius"])
        self.surface, self.mean = np.empty_like(self.times), np.empty_like(self.times)
        self.balance = np.zeros(number)
        rows = np.linspace(0, 1, PROFILE_POINTS)
        # Closer together towards the surface, where the current is.
        part = 1 - (1 - rows) ** 2
        self.radii = v["inner_radius"] + part[:, None] * (v["radius"] - v["inner_radius"])
        self.rises = np.empty((asked.size, PROFILE_POINTS, number))
        self.densities = np.empty_like(self.rises)
        # Scenarios of like length together: a block marches as long as its longest.
        order = np.argsort((steps > 0).sum(axis=0), kind="stable")
        for begin in range(0, number, BLOCK):
            chosen = order[begin : begin + BLOCK]
            count = int((steps[:, chosen] > 0).any(axis=1).sum())
            march = March(
                Block(
                    faces=[self.faces[j] for j in chosen],
                    law=law,
                    **{name: v[name][chosen] for name in _MATERIAL},
                )
            )
            brackets = [self._brackets(j, asked) for j in chosen]
            wanted = [[index for pair in b for index in pair[:2]] for b in brackets]
            history = march.run(
                steps[:count, chosen], peak[: count + 1, chosen], between[:count, chosen], wanted
            )
            self._gather(chosen, count, history)
            self._profiles(chosen, march, history, brackets)

    @staticmethod
    def _current(current: Callable[[Array], Any], at: Array, shape: tuple[int, ...]) -> Array:
        wanted = (at.shape[0], *shape)
        values = np.asarray(current(at.reshape(wanted)), dtype=float)
        try:
            values = np.broadcast_to(values, wanted)
        except ValueError:
            raise ValueError(f"the current has shape {values.shape} for times of shape {wanted}") from None
        if not np.isfinite(values).all():
            raise ValueError("the current must be finite at every time")
        return values.reshape(at.shape)

    @staticmethod
    def _times(v: dict[str, Array], own: Array | None, refine: float) -> Array:
        if own is not None:
            # The estimate of the error skips every second step, a fine run divides them.
            if refine < 1:
                return own if own.shape[0] < 3 else np.concatenate([own[:-1:2], own[-1:]])
            parts = int(np.ceil(refine))
            between = [own[:-1] + np.diff(own, axis=0) * (k / parts) for k in range(parts)]
            inner = np.stack(between, axis=1).reshape(-1, own.shape[1])
            return np.concatenate([inner, own[-1:]])
        each = [time_steps(f, e, refine) for f, e in zip(v["front"], v["end"], strict=True)]
        longest = max(len(t) for t in each)
        return np.stack([np.append(t, np.full(longest - len(t), t[-1])) for t in each], axis=1)

    def _faces(self, v: dict[str, Array], refine: float) -> list[Array]:
        # A steel that saturates diffuses as one of the mean permeability up to its largest field.
        field = np.maximum(np.abs(self.peak_at).max(axis=0), 1e-300) / (2 * np.pi * v["radius"])
        mean = np.where(np.isinf(v["saturation"]), np.inf, 1 + v["saturation"] / (MU0 * field))
        first = first_cell(
            v["resistivity"],
            v["front"],
            np.minimum(v["mu_r"], mean),
            v["conductivity"] / v["heat_capacity"],
            v["tail"],
        )
        each = zip(v["inner_radius"], v["radius"], first, strict=True)
        return [radial_faces(inner, outer, f, refine) for inner, outer, f in each]

    def _gather(self, chosen: NDArray[np.intp], count: int, history: History) -> None:
        for target, source in ((self.surface, history.surface), (self.mean, history.mean)):
            target[: count + 1, chosen] = source
            target[count + 1 :, chosen] = source[-1]
        with np.errstate(invalid="ignore", divide="ignore"):
            error = (history.work - history.heat - history.magnetic) / history.work
        self.balance[chosen] = np.where(history.work == 0, 0.0, error)

    def _brackets(self, j: int, asked: Array) -> list[tuple[int, int, float]]:
        """Steps before and after each time asked for, and how far between them it is."""
        at = self.times[:, j]
        out = []
        for time in asked:
            if not 0 <= time <= at[-1]:
                raise ValueError(f"a profile at {time:g} s is outside the run, which ends at {at[-1]:g} s")
            after = max(int(np.searchsorted(at, time)), 1)
            out.append((after - 1, after, float((time - at[after - 1]) / (at[after] - at[after - 1]))))
        return out

    def _profiles(
        self,
        chosen: NDArray[np.intp],
        march: March,
        history: History,
        brackets: list[list[tuple[int, int, float]]],
    ) -> None:
        for k, j in enumerate(chosen):
            centres = np.append(march.centres_of(k), self.faces[j][-1])
            for row, (_, _, part) in enumerate(brackets[k]):
                before, after = history.snapshots[k][2 * row : 2 * row + 2]
                for target, early, late in zip((self.rises, self.densities), before, after, strict=True):
                    values = early + part * (late - early)
                    values = np.append(values, march.surface_of(k, values))
                    target[row, :, j] = np.interp(self.radii[:, j], centres, values)
