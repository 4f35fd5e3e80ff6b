"""The skin-effect kernel: what it refuses, what shapes it gives, and its parts one by one."""

import numpy as np
import pytest

from strikeenergy.physics import pulses
from strikeenergy.physics.skin import (
    MU0,
    resistivity_table,
    sampled_current,
    skin_heating,
    skin_parameter,
)
from strikeenergy.physics.skin_grid import radial_faces, surface_weights, time_steps
from strikeenergy.physics.skin_march import GAMMA, stage_quadrature

COPPER = {
    "radius": np.sqrt(50e-6 / np.pi),
    "resistivity": 17.8e-9,
    "coefficient": 3.92e-3,
    "heat_capacity": 8920 * 385,
    "conductivity": 390.0,
    "front": 19e-6,
    "tail": 485e-6,
}
STEEL = COPPER | {
    "resistivity": 120e-9,
    "coefficient": 6.5e-3,
    "heat_capacity": 7700 * 469,
    "conductivity": 50.0,
}


def impulse(peak=200e3, tau1=19e-6, tau2=485e-6, k=0.93):
    return lambda t: pulses.heidler_current(t, peak, tau1, tau2, 10.0, k)


# -- the skin parameter ------------------------------------------------------------------------------------


def test_parameter_of_a_wire():
    assert skin_parameter(4e-3, 17.8e-9, 485e-6) == pytest.approx(16e-6 * MU0 / (17.8e-9 * 485e-6), rel=1e-12)
    assert skin_parameter(4e-3, 120e-9, 485e-6, mu_r=200) == pytest.approx(
        200 * skin_parameter(4e-3, 120e-9, 485e-6), rel=1e-12
    )
    np.testing.assert_allclose(
        skin_parameter([2e-3, 4e-3], 17.8e-9, [1e-4, 4e-4]), skin_parameter(2e-3, 17.8e-9, 1e-4)
    )


def test_parameter_of_a_tube():
    """Between a thin wall, with 8/3 of its square, and the wire; without a jump where the series takes over."""
    wire, thin = skin_parameter(1.0, 1.0, MU0), skin_parameter(1.0, 1.0, MU0, inner_radius=1 - 1e-5)
    assert wire == 1
    assert thin == pytest.approx(8 / 3 * 1e-10, rel=1e-4)
    assert skin_parameter(1.0, 1.0, MU0, inner_radius=1e-9) == pytest.approx(1, rel=1e-9)
    inner = np.linspace(0, 1, 4001)[:-1]
    values = skin_parameter(1.0, 1.0, MU0, inner_radius=inner)
    assert (np.diff(values) < 0).all()
    below, above = skin_parameter(1.0, 1.0, MU0, inner_radius=np.sqrt(1 - np.array([0.999e-3, 1.001e-3])))
    assert above / below == pytest.approx((1.001 / 0.999) ** 2, rel=1e-5)


def test_parameter_of_a_tube_is_the_first_excess_of_its_surface():
    """A current that grows evenly, after the transient: E at the surface over ρ·J is 1 + p·τ2/8·(di/dt)/i."""
    inner, outer, rho = 5e-3, 8e-3, 17.8e-9
    end = 0.05
    result = skin_heating(
        lambda t: 1e3 * t / end,
        radius=outer,
        inner_radius=inner,
        front=end,
        tail=end,
        end=end,
        resistivity=rho,
        heat_capacity=3.4e6,
        profile_times=[end],
        refine=4.0,
        estimate_error=False,
    )
    even = 1e3 / (np.pi * (outer**2 - inner**2))
    excess = result.profile_density[0, -1] / even - 1
    assert excess == pytest.approx(result.skin_parameter / 8, rel=5e-3)


# -- grids -------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("first", [1e-7, 1e-5, 1e-3])
def test_faces_fill_the_wall_and_are_fine_at_the_surface(first):
    faces = radial_faces(1e-3, 4e-3, first, 1.0)
    widths = np.diff(faces)
    assert faces[0] == 1e-3
    assert faces[-1] == 4e-3
    assert widths[-1] <= first * (1 + 1e-9)
    np.testing.assert_allclose(widths[:-1] / widths[1:], 1.1, rtol=1e-6)
    fine = radial_faces(1e-3, 4e-3, first, 2.0)
    assert np.diff(fine)[-1] <= 0.55 * widths[-1]


def test_surface_value_is_exact_for_a_parabola_in_the_area():
    faces = radial_faces(0.0, 4e-3, 1.5e-5, 1.0)
    # means over the cells of 3 − 2·x + 5·x², x = (r/R)², by its integral
    x = (faces / 4e-3) ** 2
    whole = 3 * x - x**2 + 5 / 3 * x**3
    means = np.diff(whole) / np.diff(x)
    assert surface_weights(np.diff(faces**2) / 2) @ means[-3:] == pytest.approx(6.0, rel=1e-9)


@pytest.mark.parametrize(("end", "refine"), [(2.4e-3, 1.0), (2.4e-3, 2.0), (1e-5, 1.0)])
def test_steps_begin_small_and_end_at_the_end(end, refine):
    times = time_steps(1e-5, end, refine)
    steps = np.diff(times)
    assert times[0] == 0
    assert times[-1] == pytest.approx(end, rel=1e-12)
    assert steps[0] == pytest.approx(1e-5 / 40 / refine, rel=1e-9)
    assert (steps[1:] / steps[:-1]).max() <= 1 + 0.0201 / refine


def test_quadrature_of_a_step_is_exact_for_parabolas():
    x = np.array([0.0, GAMMA, 1.0])
    start, middle, end = 2 - 3 * x + 4 * x**2
    assert stage_quadrature(start, middle, end) == pytest.approx(2 - 1.5 + 4 / 3, rel=1e-14)


# -- shapes ------------------------------------------------------------------------------------------------


def test_one_scenario_gives_numbers():
    result = skin_heating(impulse(), **COPPER, profile_times=[20e-6, 1e-3])
    assert result.surface_rise.shape == ()
    assert float(result.surface_rise) == pytest.approx(37.0, rel=0.01)
    assert result.times.shape == result.surface_history.shape
    assert result.profile_rise.shape == (2, len(result.profile_radii))
    assert result.cells > 15


def test_axes_of_scenarios_are_kept():
    tau1, tau2 = np.array([19e-6, 1.82e-6]), np.array([485e-6, 285e-6])
    radius = np.array([2e-3, 4e-3, 8e-3])[:, None]
    result = skin_heating(
        lambda t: pulses.heidler_current(t, 1e5, tau1, tau2, 10.0, 1.0),
        **COPPER | {"radius": radius, "front": tau1, "tail": tau2},
        profile_times=[1e-5],
    )
    assert result.surface_rise.shape == (3, 2)
    assert result.mean_history.shape == (len(result.times), 3, 2)
    assert result.profile_density.shape == (1, len(result.profile_radii), 3, 2)
    # The thinner conductor is hotter, the thicker one suffers more from the skin effect.
    assert (np.diff(result.surface_rise, axis=0) < 0).all()
    assert (np.diff(result.surface_factor, axis=0) > 0).all()


def test_blocks_and_mixed_magnets_are_put_back_in_order(monkeypatch):
    monkeypatch.setattr("strikeenergy.physics.skin_run.BLOCK", 2)
    saturation = np.array([2.0, np.inf, 1.6, np.inf, 2.0])
    mu_r = np.where(np.isinf(saturation), 1.0, 200.0)
    tail = np.array([485e-6, 100e-6, 300e-6, 485e-6, 200e-6])

    def current(t, tail=tail):
        return pulses.heidler_current(t, 1e5, 5e-6, tail, 10.0, 1.0)

    given = {name: value for name, value in STEEL.items() if name not in ("front", "tail")}
    many = skin_heating(current, **given, front=5e-6, tail=tail, mu_r=mu_r, saturation=saturation)
    for j in range(5):
        one = skin_heating(
            lambda t, j=j: current(t, tail[j]),
            **given, front=5e-6, tail=tail[j], mu_r=mu_r[j], saturation=saturation[j],
        )  # fmt: skip
        for name in ("surface_rise", "mean_rise", "surface_error", "energy_balance_error", "cells"):
            np.testing.assert_allclose(getattr(many, name)[j], getattr(one, name), rtol=1e-6, atol=1e-9)


def test_profiles_join_the_histories():
    result = skin_heating(impulse(), **COPPER, profile_times=[25e-6])
    rise, density, radii = result.profile_rise[0], result.profile_density[0], result.profile_radii
    assert rise[-1] == pytest.approx(np.interp(25e-6, result.times, result.surface_history), rel=1e-9)
    assert (np.diff(rise) >= -1e-12).all()
    # What is drawn of the current density carries the current.
    carried = np.trapezoid(density * 2 * np.pi * radii, radii)
    assert carried == pytest.approx(float(impulse()(np.array(25e-6))), rel=5e-3)


def test_coarse_grid_only_on_request():
    assert np.isnan(skin_heating(impulse(), **COPPER, estimate_error=False).surface_error)


# -- currents and laws -------------------------------------------------------------------------------------


def test_a_sampled_current_is_that_current():
    at = np.concatenate([np.linspace(0, 60e-6, 600), np.geomspace(61e-6, 2.5e-3, 600)])
    sampled = skin_heating(sampled_current(at, impulse()(at)), **COPPER, estimate_error=False)
    smooth = skin_heating(impulse(), **COPPER, estimate_error=False)
    assert sampled.surface_rise == pytest.approx(float(smooth.surface_rise), rel=1e-3)


def test_own_times_serve_a_second_stroke():
    """Two equal strokes 10 ms apart: the specific energies add up, and the second begins on a warmer wire."""
    once = time_steps(19e-6, 2.4e-3, 1.0)
    twice = np.concatenate([once, 10e-3 + once])
    first = impulse(100e3)

    def current(t):
        return first(t) + first(t - 10e-3)

    result = skin_heating(current, **COPPER, times=twice, estimate_error=False)
    single = skin_heating(first, **COPPER, estimate_error=False)
    assert result.specific_energy == pytest.approx(2 * float(single.specific_energy), rel=1e-3)
    assert result.mean_rise > 2 * single.mean_rise
    assert result.mean_rise == pytest.approx(2 * float(single.mean_rise), rel=0.05)


def test_a_table_of_the_linear_law_gives_what_the_linear_law_gives():
    rho, alpha = COPPER["resistivity"], COPPER["coefficient"]
    rises = np.array([0.0, 3000.0])
    given = {name: value for name, value in COPPER.items() if name not in ("resistivity", "coefficient")}
    given["radius"] = np.sqrt(16e-6 / np.pi)
    table = skin_heating(
        impulse(),
        **given,
        resistivity=resistivity_table(rises, rho * (1 + alpha * rises)),
        estimate_error=False,
    )
    linear = skin_heating(impulse(), **given, resistivity=rho, coefficient=alpha, estimate_error=False)
    for name in ("surface_rise", "mean_rise", "uniform_rise"):
        assert getattr(table, name) == pytest.approx(float(getattr(linear, name)), rel=3e-4), name


def test_an_infinite_saturation_is_a_constant_permeability_and_a_low_field_too():
    """So little current that the arctangent is straight: the saturating steel behaves as the constant one."""
    weak = impulse(0.02)
    steel = skin_heating(weak, **STEEL, mu_r=200.0, saturation=2.0, refine=2.0, estimate_error=False)
    constant = skin_heating(
        weak, **STEEL, mu_r=200.0, refine=2.0, estimate_error=False, constant_permeability_for_tests=True
    )
    assert steel.surface_factor > 10
    assert steel.surface_rise == pytest.approx(float(constant.surface_rise), rel=2e-3)


def test_a_conductor_that_is_gone_does_not_spoil_the_others():
    radius = np.array([0.1e-3, 4e-3])
    result = skin_heating(impulse(), **COPPER | {"radius": radius})
    assert np.isinf(result.surface_rise[0])
    assert np.isinf(result.uniform_rise[0])
    assert result.surface_rise[1] == pytest.approx(36.8, rel=0.02)


def test_no_current_no_heat():
    result = skin_heating(lambda t: 0.0 * t, **STEEL, mu_r=200.0, saturation=2.0)
    assert result.surface_rise == 0
    assert result.energy_balance_error == 0


def test_a_jump_of_the_current_stays_positive():
    """A rectangle begins at its full value: L-stable steps heat every cell and overshoot little."""
    result = skin_heating(
        lambda t: np.where(t < 1e-3, 1e4, 0.0), **COPPER | {"front": 1e-5, "tail": 1e-3}, end=2e-3
    )
    assert (result.mean_history[1:] > 0).all()
    assert result.specific_energy == pytest.approx(1e5, rel=0.02)
    assert result.mean_factor > 1


# -- what is refused ---------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("change", "says"),
    [
        ({"mu_r": 200.0}, "no model of iron"),
        ({"mu_r": np.array([1.0, 11.0])}, "no model of iron"),
        ({"mu_r": 0.5}, "at least 1"),
        ({"inner_radius": 4e-3}, "wall is thicker"),
        ({"inner_radius": -1e-3}, "not be negative"),
        ({"radius": 0.0}, "radius must be positive"),
        ({"resistivity": np.nan}, "resistivity must be positive"),
        ({"heat_capacity": np.inf}, "heat_capacity must be finite"),
        ({"conductivity": -1.0}, "conductivity must not be negative"),
        ({"front": 0.0}, "front must be positive"),
        ({"end": -1.0}, "end must be positive"),
        ({"saturation": 0.0}, "saturation must be positive"),
        ({"times": [0.0, 2e-6, 1e-6]}, "times must rise"),
        ({"times": [1e-6, 2e-6]}, "times must rise"),
        ({"refine": 0.1}, "refine"),
        ({"profile_times": [1.0]}, "outside the run"),
        ({"resistivity": lambda rise: 1e-8 + 0 * rise}, "coefficient belongs"),
    ],
)
def test_refused(change, says):
    with pytest.raises(ValueError, match=says):
        skin_heating(impulse(), **COPPER | change)


def test_refused_currents_and_tables():
    with pytest.raises(ValueError, match="finite"):
        skin_heating(lambda t: np.where(t > 1e-4, np.nan, 1e3), **COPPER)
    with pytest.raises(ValueError, match="shape"):
        skin_heating(lambda t: np.ones(7), **COPPER)
    with pytest.raises(ValueError, match="rising times"):
        sampled_current([0, 1, 1], [0, 1, 2])
    with pytest.raises(ValueError, match="rising temperatures"):
        resistivity_table([0, 1], [1e-8])
    with pytest.raises(ValueError, match="positive"):
        resistivity_table([0, 1], [1e-8, -1e-8])


def test_a_small_constant_permeability_passes():
    result = skin_heating(impulse(), **STEEL, mu_r=2.0, estimate_error=False)
    assert result.surface_factor > skin_heating(impulse(), **STEEL, estimate_error=False).surface_factor


@pytest.mark.parametrize("mu_r", [50.0, 1000.0, 20000.0])
def test_a_large_current_that_reverses_in_steel_converges(mu_r):
    """The flat ends of the magnetisation curve throw a plain Newton step from one side to the other."""
    result = skin_heating(
        lambda t: 3e4 * np.sin(2 * np.pi * 2e4 * t) * np.exp(-t / 1e-4),
        **STEEL | {"front": 8e-6, "tail": 1e-4},
        mu_r=mu_r,
        saturation=2.1,
        times=np.linspace(0, 2e-4, 641),
        estimate_error=False,
    )
    assert 5 < result.surface_factor < 60
    assert abs(result.energy_balance_error) < 0.02
