"""Skin effect and heating of a round wire or tube by a current pulse: how much hotter the surface runs than the mean.

Magnetic diffusion, Joule heat and conduction of heat along the radius, coupled through the resistivity::

    ∂B/∂t = ∂(ρ·J)/∂r,    J = (1/r)·∂(r·H)/∂r,    B = B(H),    r·H = i(t)/(2π) at the surface, 0 inside
    C·∂θ/∂t = ρ(θ)·J² + (1/r)·∂(r·k·∂θ/∂r)/∂r,    no heat through the surfaces

    ρ(θ) = ρ0·(1 + α·θ), or any law;    B = μ0·μr·H, or B = μ0·H + (2·Bs/π)·arctan(π·(μr − 1)·μ0·H/(2·Bs))

Symbols and units: θ rise over the start (K), ``resistivity`` ρ0 and ``coefficient`` α at the *starting* temperature
(ohm·m, 1/K), ``heat_capacity`` C per volume (J/(m³·K)), ``conductivity`` k (W/(m·K)), ``mu_r`` relative permeability
(the initial one where the steel saturates, 1), ``saturation`` Bs (T), ``radius`` and ``inner_radius`` (m), ``front`` τ1
and ``tail`` τ2 of the current (s). The uniform law beside it is that of ``adiabatic`` with the current's own ∫i²dt.

Shapes: every argument may be a number or an array, they broadcast, and each element is a scenario with grid and steps
of its own: it gives the same alone as in company. Times, radii and the like come as a first axis before these.

Sources: the equations are Maxwell's in a good conductor (Knoepfel, Magnetic Fields, Wiley 2000, chapter 4); the material
law is that of IEC 62305-1:2010 Annex D.4; the arctangent is a common closure for the virgin curve, without hysteresis.
The scheme is in ``skin_march``, the grids are in ``skin_grid`` and ``skin_run``. Checked against the Bessel solution for
alternating current: within 0.5 % on the default grid, 0.05 % with ``refine = 4``; surface rises behind Heidler fronts
on the default grid are within 0.2 % of those on the fine one.

Valid: a straight round conductor with its return far away or coaxial (nothing depends on the angle); solid metal; a
current that lasts milliseconds, so that nothing cools. Above a thousand kelvin the linear ρ(θ) is an extrapolation.

Leaves out: heat loss; melting; change of C, k and Bs with temperature, the Curie point; hysteresis; proximity to other
conductors; displacement current (far below 1e-6 in metals); magnetic pressure. A tape or a strand is not round: the
wire of equal section overstates the mean skin effect of a tape (though its edges run hotter), and stands for a strand
whose bare wires touch.

A *constant* permeability of iron at a lightning current is refused: μr = 200 would give rises of thousands of kelvin
where saturated steel stays within some per cent of the uniform law.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from strikeenergy.physics.skin_grid import MU0, Array, skin_parameter
from strikeenergy.physics.skin_run import Run

__all__ = ["MU0", "SkinResult", "resistivity_table", "sampled_current", "skin_heating", "skin_parameter"]

CONSTANT_PERMEABILITY = 10.0
"""Above this a constant relative permeability is refused."""
END_IN_TAILS = 5.0
"""Default end of the run in τ2: e^(−10) of the specific energy is left then."""
COARSE = 0.5
ORDER_GAIN = 3.0  # 2² − 1: what two grids of a ratio of 2 leave of their difference, at second order


@dataclass(frozen=True)
class SkinResult:
    """What the diffusion of the current does to the heating. Shape of each array: that of the scenarios, () for one."""

    surface_rise: Array
    """Highest rise of the surface (K) during the run."""
    mean_rise: Array
    """Mean rise of the section (K) at the end."""
    uniform_rise: Array
    """Rise of a section that the current fills evenly (K), with the same ∫i²dt: the adiabatic law."""
    surface_factor: Array
    """surface_rise/uniform_rise (1)."""
    mean_factor: Array
    """mean_rise/uniform_rise (1)."""
    skin_parameter: Array
    """p = R²·μ0·μr/(ρ·τ2) (1), see ``skin_parameter``."""
    specific_energy: Array
    """∫i²dt during the run (J/ohm)."""
    energy_balance_error: Array
    """(energy fed in − heat − magnetic energy)/energy fed in (1): the error of the steps in time."""
    surface_error: Array
    """Estimated discretisation error of ``surface_rise``, relative (1): from a second grid; NaN where none was run."""
    mean_error: Array
    """The same for ``mean_rise``."""
    times: Array
    """Times (s) of the histories, as a first axis; a scenario that is over repeats its last."""
    surface_history: Array
    """Rise of the surface (K) at ``times``."""
    mean_history: Array
    """Mean rise of the section (K) at ``times``."""
    profile_radii: Array
    """Radii (m) of the profiles, as a first axis, from the inner face to the surface, closer together there."""
    profile_rise: Array
    """Rise (K) along the radius: axes profile time, radius, scenarios."""
    profile_density: Array
    """Current density (A/m²) along the radius, on the same axes."""
    cells: Array
    """Number of cells."""


def sampled_current(times: Any, currents: Any) -> Callable[[Array], Array]:
    """Make a current of samples (s, A; one axis), straight between them and zero outside: for ``skin_heating``."""
    at, values = np.asarray(times, dtype=float), np.asarray(currents, dtype=float)
    if at.ndim != 1 or at.shape != values.shape or at.size < 2 or not (np.diff(at) > 0).all():
        raise ValueError("a sampled current takes rising times and as many currents, each on one axis")
    return lambda t: np.interp(t, at, values, left=0.0, right=0.0)


def resistivity_table(rises: Any, resistivities: Any) -> Callable[[Array], Array]:
    """Make a law ρ(θ) of a table (K over the start, ohm·m), straight between its entries and held beyond its ends."""
    at, values = np.asarray(rises, dtype=float), np.asarray(resistivities, dtype=float)
    if at.ndim != 1 or at.shape != values.shape or at.size < 2 or not (np.diff(at) > 0).all():
        raise ValueError(
            "a table of resistivity takes rising temperatures and as many values, each on one axis"
        )
    if not (values > 0).all():
        raise ValueError("a table of resistivity takes positive values")
    return lambda rise: np.interp(rise, at, values)


def skin_heating(
    current: Callable[[Array], Any],
    *,
    radius: Any,
    front: Any,
    tail: Any,
    resistivity: Any,
    heat_capacity: Any,
    coefficient: Any = 0.0,
    conductivity: Any = 0.0,
    inner_radius: Any = 0.0,
    mu_r: Any = 1.0,
    saturation: Any = np.inf,
    end: Any = None,
    times: Any = None,
    refine: float = 1.0,
    profile_times: Sequence[float] = (),
    estimate_error: bool = True,
    constant_permeability_for_tests: bool = False,
) -> SkinResult:
    """Heat a round wire or tube by the current i(t), with the skin effect. The module says what it solves.

    Args:
        current: i(t) in A of times in s: called with an array of times before the axes of the scenarios, gives one
            that broadcasts with it. For samples see ``sampled_current``.
        radius, inner_radius: of the metal (m); ``inner_radius`` 0 is a wire.
        front: time constant of the rise, τ1 of a Heidler function (s). Sets the first cell and the first steps, so for
            other shapes the shortest time in which the current changes by its own size.
        tail: time constant of the decay, τ2 (s): for the skin parameter and the default ``end``.
        resistivity: at the start (ohm·m); or a callable ρ(θ) of the rises in K, the same for every scenario.
        coefficient: of the linear law, referred to the start (1/K). Not beside a callable.
        saturation: Bs (T) of the arctangent; infinite for a constant permeability.
        end: when to stop (s); by default 5·τ2.
        times: the steps themselves (s) instead, from 0 (first axis): for a current that changes fast again later on, or
            jumps (a late jump in a long step shows in ``energy_balance_error``). The estimate takes every second one.
        refine: divides cells, growth and steps; 1 is the default grid, 4 a fine one.
        profile_times: times (s) at which to keep rise and current density along the radius; straight between steps.
        estimate_error: run a second grid with ``refine``/2 to estimate the error (some 40 % more work).
        constant_permeability_for_tests: let a constant permeability above 10 pass, for checks against the Bessel
            solution. Never for a lightning current.

    Raises:
        ValueError: for what is not a conductor or not a current, and for a constant permeability above 10.
    """
    law = resistivity if callable(resistivity) else None
    rho0 = np.asarray(law(np.zeros(1)), dtype=float)[0] if law else resistivity
    given = {
        "radius": radius, "front": front, "tail": tail, "resistivity": rho0, "heat_capacity": heat_capacity,
        "coefficient": coefficient, "conductivity": conductivity, "inner_radius": inner_radius, "mu_r": mu_r,
        "saturation": saturation, "end": END_IN_TAILS * np.asarray(tail, dtype=float) if end is None else end,
    }  # fmt: skip
    spread = np.broadcast_arrays(*(np.asarray(v, dtype=float) for v in given.values()))
    shape = spread[0].shape
    values = dict(zip(given, (a.ravel() for a in spread), strict=True))
    _check(values, constant_permeability_for_tests, law is not None and bool(np.any(np.asarray(coefficient))))
    if refine < 0.5:
        raise ValueError("refine must be at least 0.5")
    own = None if times is None else _own_times(times, shape)
    asked = np.asarray(profile_times, dtype=float).ravel()
    fine = Run(current, values, law, shape, own, refine, asked)
    coarse = Run(current, values, law, shape, own, COARSE * refine, asked[:0]) if estimate_error else None
    return _result(values, law, shape, fine, coarse)


def _check(v: dict[str, Array], allowed: bool, two_laws: bool) -> None:
    for name in ("radius", "front", "tail", "resistivity", "heat_capacity", "saturation", "end"):
        if not (v[name] > 0).all():
            raise ValueError(f"{name} must be positive")
    for name in ("conductivity", "inner_radius"):
        if not (v[name] >= 0).all():
            raise ValueError(f"{name} must not be negative")
    for name, numbers in v.items():
        if name != "saturation" and not np.isfinite(numbers).all():
            raise ValueError(f"{name} must be finite")
    if not (v["inner_radius"] < v["radius"]).all():
        raise ValueError("inner_radius must be less than radius: the wall is thicker than the conductor")
    if not (v["mu_r"] >= 1).all():
        raise ValueError("mu_r must be at least 1")
    if two_laws:
        raise ValueError(
            "coefficient belongs to the linear law: leave it out where resistivity is a law of its own"
        )
    if not allowed and (np.isinf(v["saturation"]) & (v["mu_r"] > CONSTANT_PERMEABILITY)).any():
        raise ValueError(
            f"a constant mu_r above {CONSTANT_PERMEABILITY:g} is no model of iron at a lightning current (it would "
            "give rises of thousands of kelvin): give the saturation (T) of the steel, or mu_r = 1"
        )


def _own_times(times: Any, shape: tuple[int, ...]) -> Array:
    at = np.asarray(times, dtype=float)
    if at.ndim == 1:
        at = at.reshape((-1,) + (1,) * len(shape))
    at = np.broadcast_to(at, (at.shape[0], *shape)).reshape(at.shape[0], -1)
    if (
        at.shape[0] < 2
        or not np.isfinite(at).all()
        or (at[0] != 0).any()
        or not (np.diff(at, axis=0) > 0).all()
    ):
        raise ValueError("times must rise from 0")
    return at


def _uniform_rise(v: dict[str, Array], law: Callable[[Array], Array] | None, run: Run) -> Array:
    """Rise (K) of an evenly filled section: the closed form of ``adiabatic``, or dθ/dW = ρ(θ)/(q²·C) for another law."""
    if law is None:
        alpha = np.where(np.abs(v["coefficient"]) < 1e-15, 1e-15, v["coefficient"])
        exponent = np.where(run.gone, 0.0, alpha * run.heating)
        rise: Array = np.where(run.gone, np.inf, np.expm1(exponent) / alpha)
        return rise
    parts = 400
    pace = run.heating / v["resistivity"] / parts
    rise = np.zeros_like(pace)
    for _ in range(parts):
        k1 = law(rise)
        k2 = law(rise + 0.5 * pace * k1)
        k3 = law(rise + 0.5 * pace * k2)
        k4 = law(rise + pace * k3)
        rise = rise + pace * (k1 + 2 * k2 + 2 * k3 + k4) / 6
    return rise


def _result(
    v: dict[str, Array],
    law: Callable[[Array], Array] | None,
    shape: tuple[int, ...],
    fine: Run,
    coarse: Run | None,
) -> SkinResult:
    uniform = _uniform_rise(v, law, fine)
    surface, mean = (np.where(fine.gone, np.inf, h) for h in (fine.surface.max(axis=0), fine.mean[-1]))
    errors = [np.full(len(uniform), np.nan)] * 2
    with np.errstate(invalid="ignore", divide="ignore"):
        if coarse is not None:
            others = coarse.surface.max(axis=0), coarse.mean[-1]
            errors = [np.abs(a / b - 1) / ORDER_GAIN for a, b in zip(others, (surface, mean), strict=True)]
            errors = [np.where(fine.gone, np.nan, e) for e in errors]
        factors = [a / uniform for a in (surface, mean)]

    def shaped(values: Array) -> Array:
        out: Array = values.reshape(values.shape[:-1] + shape)
        return out

    return SkinResult(
        surface_rise=shaped(surface),
        mean_rise=shaped(mean),
        uniform_rise=shaped(uniform),
        surface_factor=shaped(factors[0]),
        mean_factor=shaped(factors[1]),
        skin_parameter=shaped(
            np.atleast_1d(
                skin_parameter(
                    v["radius"], v["resistivity"], v["tail"], mu_r=v["mu_r"], inner_radius=v["inner_radius"]
                )
            )
        ),
        specific_energy=shaped(fine.energy),
        energy_balance_error=shaped(fine.balance),
        surface_error=shaped(errors[0]),
        mean_error=shaped(errors[1]),
        times=shaped(fine.times),
        surface_history=shaped(fine.surface),
        mean_history=shaped(fine.mean),
        profile_radii=shaped(fine.radii),
        profile_rise=shaped(fine.rises),
        profile_density=shaped(fine.densities),
        cells=shaped(np.array([len(f) - 1 for f in fine.faces])),
    )
