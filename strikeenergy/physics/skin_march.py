"""One block of round conductors, marched through their currents: the numerical scheme of the skin effect.

Finite volumes in radius, all scenarios one after another in flat arrays, so that each has its own grid and one call of
LAPACK solves the tridiagonal systems of all (they are symmetric positive definite and do not touch each other). The
result of a scenario therefore does not depend on the company it is in.

Unknowns: u = r·H (A/rad) on the faces, temperature rise θ (K) in the cells, which are numbered from the axis outwards.
Per radian and metre of length, with the cell areas A and the resistivity ρ(θ)::

    J = (u_k − u_(k−1))/A,    d/dt φ(u_k) = ρ·J|_(k+1) − ρ·J|_k,    φ(u) = B(u/r)·r·ln(c_(k+1)/c_k)
    u = 0 on the inner face,  u = i/(2π) on the outer:              the total current is exact

c are the radii of the area centroids: there the cell mean of a field that is linear in r² is that field itself.

Time: TR-BDF2 with γ = 2 − √2 (Bank et al., IEEE Trans. Electron Devices 32 (1985) 1992; Hosea and Shampine, Appl.
Numer. Math. 20 (1996) 21), second order and L-stable; both stages have the same matrix. The resistivity of a step is
that of its middle, foreseen from the Joule heat at its start. The heat of a step follows from ∫J²dt by the quadrature
that is exact for parabolas through both stages, and from the exact growth of a linear ρ(θ), exp(α·ρ0·∫J²dt/C).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np

from strikeenergy.physics.skin_grid import MU0, Array, surface_weights

__all__ = ["Block", "History", "March"]

GAMMA = 2 - np.sqrt(2)
STAGE = GAMMA / 2  # weight of the new value in both stages, times the step
PULL = 1 / (GAMMA * (2 - GAMMA))  # right side of the second stage: φ_n + PULL·(φ* − φ_n)
W_MIDDLE = 1 / (6 * GAMMA * (1 - GAMMA))  # quadrature on the nodes 0, γ, 1
W_END = 0.5 - GAMMA * W_MIDDLE
W_START = 1 - W_MIDDLE - W_END

NEWTON_LIMIT = 100
NEWTON_TOLERANCE = 1e-9
SEARCH_LIMIT = 12


def stage_quadrature(start: Array, middle: Array, end: Array) -> Array:
    """Mean over a step (same unit) of what has these values at its start, at γ of it, and at its end."""
    mean: Array = W_START * start + W_MIDDLE * middle + W_END * end
    return mean


@dataclass(frozen=True)
class Block:
    """Conductors of one block: one entry a scenario, SI units. ``resistivity`` is that at the start."""

    faces: list[Array]
    resistivity: Array
    coefficient: Array
    """Of the linear law, referred to the start (1/K); not used where ``law`` is given."""
    heat_capacity: Array
    """Per volume (J/(m³·K))."""
    conductivity: Array
    mu_r: Array
    saturation: Array
    """Bs (T); infinite where the permeability is constant."""
    law: Callable[[Array], Array] | None = None
    """Resistivity (ohm·m) of the rises (K) in the flat array of all cells; None: linear."""


@dataclass(frozen=True)
class History:
    """What a march leaves: surface and mean rise (K) at every time, energies (J/m), and snapshots of the section."""

    surface: Array
    mean: Array
    heat: Array
    magnetic: Array
    work: Array
    """Fed in through the centre of the outermost cell."""
    snapshots: list[list[tuple[Array, Array]]] = field(default_factory=list)
    """Per scenario, for each index asked for: rise (K) and current density (A/m²) in its cells."""


class March:
    """The scheme on one block. ``run`` marches it."""

    def __init__(self, block: Block) -> None:
        from scipy.linalg import lapack

        self.factor, self.solve, self.factor_and_solve = lapack.dpttrf, lapack.dpttrs, lapack.dptsv
        counts = [len(f) - 1 for f in block.faces]
        self.first = np.concatenate([[0], np.cumsum(counts)[:-1]]).astype(np.intp)
        self.last = (np.cumsum(counts) - 1).astype(np.intp)
        self.owner = np.repeat(np.arange(len(counts)), counts)
        areas = [np.diff(f * f) / 2 for f in block.faces]
        centres = [np.sqrt((f[1:] ** 2 + f[:-1] ** 2) / 2) for f in block.faces]
        area = np.concatenate(areas)
        self.per_area = 1 / area
        self.centre = np.concatenate(centres)
        self.radius = np.concatenate([f[1:] for f in block.faces])
        self.weights = np.stack([surface_weights(a) for a in areas])
        # The outermost face is not an unknown; zero is what its entries of the matrix are then put to.
        self.width = np.concatenate([np.append(np.log(c[1:] / c[:-1]), 0.0) for c in centres])
        spread = np.concatenate([np.append(1 / np.diff(c), 0.0) for c in centres])
        self.conductance = block.conductivity[self.owner] * self.radius * spread
        self.conducts = bool((block.conductivity > 0).any())
        self.capacity = block.heat_capacity[self.owner] * area
        self.heat_capacity = block.heat_capacity[self.owner]
        self.rho0 = block.resistivity[self.owner]
        self.law = block.law
        self._linear_law(block.coefficient)
        self._magnetisation(block.mu_r, block.saturation)

    def _linear_law(self, coefficient: Array) -> None:
        # A coefficient of zero becomes one too small to be seen; expm1 keeps it accurate.
        small = np.abs(coefficient) < 1e-15
        alpha = np.where(small, 1e-15, coefficient)[self.owner]
        self.slope = self.rho0 * alpha
        self.rate = self.slope / self.heat_capacity
        self.offset = 1 / alpha
        # expm1 costs ten times as much as exp, and is only needed for small coefficients.
        self.accurate = bool((np.abs(coefficient) < 1e-5).any())

    def _magnetisation(self, mu_r: Array, saturation: Array) -> None:
        saturates = np.isfinite(saturation)
        linear = np.where(saturates, 1.0, mu_r)
        self.mass = (MU0 * linear)[self.owner] * self.width
        self.twice_mass = 2 * self.mass
        self.saturates = bool(saturates.any())
        if self.saturates:
            with np.errstate(invalid="ignore"):
                top = np.where(saturates, 2 * saturation / np.pi, 0.0)
                bend = np.where(saturates, np.pi * (mu_r - 1) * MU0 / (2 * saturation), 0.0)
            self.top = top[self.owner] * self.radius * self.width
            self.bend = bend[self.owner] / self.radius

    # -- the two systems -----------------------------------------------------------------------------------

    def _flux(self, u: Array) -> Array:
        flux: Array = self.mass * u
        if self.saturates:
            flux += self.top * np.arctan(self.bend * u)
        return flux

    def _diffuse(
        self, u: Array, rho: Array, step: Array, edge: tuple[Array, Array, Array]
    ) -> tuple[Array, Array]:
        """Give u at γ and at the end of a step; ``edge`` is u on the surface at its start, at γ and at its end."""
        last = self.last
        g = rho * self.per_area * (step * STAGE)
        outer = g[last]
        stiff = g.copy()
        stiff[:-1] += g[1:]
        off = -g[1:]
        off[last[:-1]] = 0.0
        off[last - 1] = 0.0
        if self.saturates:
            return self._diffuse_newton(u, stiff, off, outer, edge)
        diagonal = self.mass + stiff
        diagonal[last] = 1.0
        d, e, _ = self.factor(diagonal, off, overwrite_d=1, overwrite_e=1)
        # Solved for u* + u_n: then no product with the matrix is needed on the right.
        right = self.twice_mass * u
        total = edge[0] + edge[1]
        right[last - 1] += outer * total
        right[last] = total
        middle = self.solve(d, e, right, overwrite_b=1)[0].ravel() - u
        right = self.mass * (u + PULL * (middle - u))
        right[last - 1] += outer * edge[2]
        right[last] = edge[2]
        return middle, self.solve(d, e, right, overwrite_b=1)[0].ravel()

    def _diffuse_newton(
        self, u: Array, stiff: Array, off: Array, outer: Array, edge: tuple[Array, Array, Array]
    ) -> tuple[Array, Array]:
        flux = self._flux(u)
        loss = self._product(u, stiff, off)
        loss[self.last - 1] -= outer * edge[0]
        middle = self._newton(u, flux - loss, stiff, off, outer, edge[1])
        target = flux + PULL * (self._flux(middle) - flux)
        return middle, self._newton(middle, target, stiff, off, outer, edge[2])

    @staticmethod
    def _product(u: Array, stiff: Array, off: Array) -> Array:
        out: Array = stiff * u
        out[:-1] += off * u[1:]
        out[1:] += off * u[:-1]
        return out

    def _newton(self, u: Array, target: Array, stiff: Array, off: Array, outer: Array, edge: Array) -> Array:
        """Solve φ(u) + K·u = target by Newton's method with a line search.

        The left side is the slope of a convex function of u, so the search always ends; without it the flat ends of the
        arctangent throw u from one side to the other where a large current reverses.
        """
        last, first = self.last, self.first

        def residual(at: Array) -> Array:
            rest = target - self._flux(at) - self._product(at, stiff, off)
            rest[last - 1] += outer * edge
            rest[last] = 0.0
            return rest

        u = u.copy()
        u[last] = edge
        rest = residual(u)
        for _ in range(NEWTON_LIMIT):
            diagonal = self.mass + self.top * self.bend / (1 + (self.bend * u) ** 2) + stiff
            diagonal[last] = 1.0
            change = self.factor_and_solve(diagonal, off, rest)[2].ravel()
            # Against the largest u of the same scenario, which at rest gives way to that of a field of 1 A/m.
            moved = np.maximum.reduceat(np.abs(change), first)
            if (
                moved <= NEWTON_TOLERANCE * (np.maximum.reduceat(np.abs(u), first) + self.radius[last])
            ).all():
                end: Array = u + change
                return end
            downhill = np.add.reduceat(rest * change, first)
            length = np.ones(len(first))
            for _ in range(SEARCH_LIMIT):
                trial = u + length[self.owner] * change
                rest = residual(trial)
                uphill = -np.add.reduceat(rest * change, first)
                # Past the bottom by more than half of what it fell: back, as a straight slope would have it.
                beyond = uphill > 0.5 * downhill
                if not beyond.any():
                    break
                back = np.clip(downhill / np.where(beyond, downhill + uphill, 1.0), 0.1, 0.9)
                length = np.where(beyond, length * back, length)
            u = trial
        raise ArithmeticError("the field in the steel did not converge: take shorter steps")

    def _density(self, u: Array) -> Array:
        j = u.copy()
        j[1:] -= u[:-1]
        j[self.first] = u[self.first]
        j *= self.per_area
        return j

    def _conduct(self, rise: Array, gain: Array, step: Array) -> Array:
        """Rise (K) after a step in which the sources alone would add ``gain`` evenly; the sum over a section is exact."""
        flow = self.conductance * (step * STAGE)
        diagonal = self.capacity + flow
        diagonal[1:] += flow[:-1]
        d, e, _ = self.factor(diagonal, -flow[:-1], overwrite_d=1, overwrite_e=1)
        right = self.capacity * (2 * rise + GAMMA * gain)
        middle = self.solve(d, e, right, overwrite_b=1)[0].ravel() - rise
        right = self.capacity * (rise + PULL * (middle - rise) + STAGE * gain)
        end: Array = self.solve(d, e, right, overwrite_b=1)[0].ravel()
        return end

    # -- the march -----------------------------------------------------------------------------------------

    def _surface(self, values: Array) -> Array:
        w = self.weights
        value: Array = (
            w[:, 2] * values[self.last] + w[:, 1] * values[self.last - 1] + w[:, 0] * values[self.last - 2]
        )
        return value

    def surface_of(self, scenario: int, values: Array) -> float:
        """Value at the surface of one scenario, from the values in its cells."""
        return float(self.weights[scenario] @ values[-3:])

    def centres_of(self, scenario: int) -> Array:
        """Radii (m) of the cells of one scenario."""
        centres: Array = self.centre[self.first[scenario] : self.last[scenario] + 1]
        return centres

    def run(
        self, steps: Array, current: Array, between: Array, wanted: list[list[int]] | None = None
    ) -> History:
        """March through all ``steps`` (n, B).

        ``current`` (n + 1, B) in A stands at the ends of the steps, ``between`` (n, B) at γ of each. A scenario that is
        over has steps of zero, in which nothing changes. ``wanted`` names, per scenario, the indices of the times to
        keep the section of.
        """
        u, rise = np.zeros_like(self.per_area), np.zeros_like(self.per_area)
        density, rho = np.zeros_like(self.per_area), self.rho0
        squared = density
        surface, mean = np.zeros(current.shape), np.zeros(current.shape)
        work = np.zeros(current.shape[1])
        held = density[self.last]
        edges, middles = current / (2 * np.pi), between / (2 * np.pi)
        keep = _by_index(wanted)
        found: dict[tuple[int, int], tuple[Array, Array]] = {}
        self._keep(keep.get(0, ()), 0, rise, density, found)
        for n in range(len(steps)):
            step = steps[n][self.owner]
            joule = squared * step
            half = self._resistivity(rise + 0.5 * rho / self.heat_capacity * joule)
            edge = (edges[n], middles[n], edges[n + 1])
            middle, u = self._diffuse(u, half, step, edge)
            between_density, density = self._density(middle), self._density(u)
            last = squared
            squared = density * density
            joule = stage_quadrature(last, between_density * between_density, squared) * step
            gain = self._gain(rise, rho, half, joule)
            rise = self._conduct(rise, gain, step) if self.conducts else rise + gain
            rho = self._resistivity(rise)
            surface[n + 1] = self._surface(rise)
            mean[n + 1] = np.add.reduceat(rise * self.capacity, self.first)
            fed = between_density[self.last], density[self.last]
            work += (
                stage_quadrature(held * edge[0], fed[0] * edge[1], fed[1] * edge[2])
                * half[self.last]
                * steps[n]
            )
            held = fed[1]
            self._keep(keep.get(n + 1, ()), n + 1, rise, density, found)
        heat = 2 * np.pi * mean[-1]
        mean /= np.add.reduceat(self.capacity, self.first)
        listed = [[found[j, k] for k in indices] for j, indices in enumerate(wanted or [])]
        return History(surface, mean, heat, self._stored(u), 2 * np.pi * work, listed)

    def _resistivity(self, rise: Array) -> Array:
        if self.law is not None:
            return self.law(rise)
        rho: Array = self.rho0 + self.slope * rise
        return rho

    def _gain(self, rise: Array, rho: Array, half: Array, joule: Array) -> Array:
        """Rise (K) of a step without conduction; ``joule`` is ∫J²dt (A²·s/m⁴)."""
        if self.law is not None:
            # The midpoint rule, with the slope of the law inside the step left to the next one.
            gain: Array = (
                self.law(rise + 0.5 * half * joule / self.heat_capacity) * joule / self.heat_capacity
            )
            return gain
        growth = self.rate * joule
        grown: Array = (np.expm1(growth) if self.accurate else np.exp(growth) - 1) * (rise + self.offset)
        return grown

    def _stored(self, u: Array) -> Array:
        """Magnetic energy (J/m) between the axis and the centre of the outermost cell: ∫H dB, B = μ0·H + arctangent."""
        energy = 0.5 * self.mass * u * u
        if self.saturates:
            safe = np.where(self.bend > 0, self.bend, 1.0)
            energy += np.where(self.bend > 0, self.top / (2 * safe) * np.log1p((safe * u) ** 2), 0.0)
        stored: Array = 2 * np.pi * np.add.reduceat(energy, self.first)
        return stored

    def _keep(
        self,
        scenarios: tuple[int, ...] | list[int],
        index: int,
        rise: Array,
        density: Array,
        found: dict[tuple[int, int], tuple[Array, Array]],
    ) -> None:
        for j in scenarios:
            part = slice(self.first[j], self.last[j] + 1)
            found[j, index] = rise[part].copy(), density[part].copy()


def _by_index(wanted: list[list[int]] | None) -> dict[int, list[int]]:
    """Turn indices per scenario into scenarios per index."""
    keep: dict[int, list[int]] = {}
    for j, indices in enumerate(wanted or []):
        for index in sorted(set(indices)):
            keep.setdefault(index, []).append(j)
    return keep
