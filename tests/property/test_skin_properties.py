"""What must hold for every conductor and every current in the skin-effect kernel; closures beside the similarity laws."""

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from strikeenergy.physics import pulses
from strikeenergy.physics.skin import skin_heating

EXAMPLES = settings(max_examples=8)


def between(low, high):
    return st.floats(np.log(low), np.log(high)).map(lambda x: float(np.exp(x)))


@st.composite
def conductors(draw):
    """Draw a wire or a tube, of a metal between copper and stainless steel, and a current that does not melt it by far."""
    radius = draw(between(1e-3, 1e-2))
    rho, capacity = draw(between(1.5e-8, 8e-7)), draw(between(2e6, 4e6))
    tail = draw(between(5e-5, 5e-4))
    inner = draw(st.sampled_from([0.0, 0.3, 0.8])) * radius
    section = np.pi * (radius**2 - inner**2)
    # The peak that raises a section filled evenly by some 1 to 300 K.
    peak = np.sqrt(draw(between(1, 300)) * capacity * section**2 / rho / (tail / 2))
    return {
        "radius": radius,
        "inner_radius": inner,
        "resistivity": rho,
        "coefficient": draw(st.floats(0, 6.5e-3)),
        "heat_capacity": capacity,
        "conductivity": draw(st.sampled_from([0.0, 15.0, 400.0])),
        "front": tail * draw(between(3e-3, 0.1)),
        "tail": tail,
    }, peak


def heidler(peak, c):
    k = pulses.heidler_correction(c["front"], c["tail"], 10.0)
    return lambda t: pulses.heidler_current(t, peak, c["front"], c["tail"], 10.0, k)


def heat(c, peak, **change):
    c = c | change
    return skin_heating(heidler(peak, c), **{"estimate_error": False} | c)


@EXAMPLES
@given(conductors())
def test_energy_closes_and_the_surface_is_hottest(drawn):
    c, peak = drawn
    result = heat(c, peak)
    assert abs(result.energy_balance_error) <= 2e-3
    assert result.surface_factor >= 1 - 2e-3
    assert result.mean_factor >= 1 - 1e-3
    assert result.surface_rise >= result.mean_rise * (1 - 1e-3)
    assert (np.diff(result.mean_history) >= 0).all()


@EXAMPLES
@given(conductors(), between(0.1, 10))
def test_without_heating_the_factors_do_not_depend_on_the_current(drawn, scale):
    c, peak = drawn
    c = c | {"coefficient": 0.0}
    one, many = heat(c, peak), heat(c, scale * peak)
    np.testing.assert_allclose(many.surface_rise, scale**2 * one.surface_rise, rtol=1e-9)
    np.testing.assert_allclose(many.mean_factor, one.mean_factor, rtol=1e-9)


@EXAMPLES
@given(conductors(), between(0.3, 3), between(0.3, 3))
def test_cold_similarity(drawn, size, time):
    """The same p and the same shape give the same factor: radius, resistivity and times scaled together."""
    c, peak = drawn
    c = c | {"coefficient": 0.0, "conductivity": 0.0}
    other = c | {
        "radius": c["radius"] * size,
        "inner_radius": c["inner_radius"] * size,
        "front": c["front"] * time,
        "tail": c["tail"] * time,
        "resistivity": c["resistivity"] * size**2 / time,
    }
    one, many = heat(c, peak), heat(other, peak)
    np.testing.assert_allclose(many.skin_parameter, one.skin_parameter, rtol=1e-9)
    # The number of cells and steps is a whole one, which rounding may tip.
    np.testing.assert_allclose(many.surface_factor, one.surface_factor, rtol=1e-3)


@EXAMPLES
@given(conductors(), st.floats(1.2, 3))
def test_more_skin_more_heat_and_conduction_softens_it(drawn, more):
    c, peak = drawn
    thin = heat(c, peak, conductivity=0.0)
    hot = heat(c, peak, conductivity=400.0)
    assert hot.surface_rise <= thin.surface_rise * (1 + 1e-3)
    # A faster front on the same tail.
    faster = skin_heating(
        heidler(peak, c | {"front": c["front"] / more}),
        **c | {"conductivity": 0.0, "front": c["front"] / more},
        estimate_error=False,
    )
    assert faster.surface_factor >= thin.surface_factor * (1 - 3e-3)


@settings(max_examples=5)
@given(conductors(), st.floats(0.5, 2.2), st.floats(20, 400))
def test_saturation_lies_between_no_magnetism_and_more_of_it(drawn, saturation, mu_r):
    c, peak = drawn
    air = heat(c, peak)
    steel = heat(c, peak, mu_r=mu_r, saturation=saturation)
    more = heat(c, peak, mu_r=mu_r, saturation=1.3 * saturation)
    assert steel.surface_rise >= air.surface_rise * (1 - 3e-3)
    assert more.surface_rise >= steel.surface_rise * (1 - 5e-3)
    assert abs(steel.energy_balance_error) <= 5e-3


@EXAMPLES
@given(conductors())
def test_the_estimate_of_the_error_is_of_its_size(drawn):
    c, peak = drawn
    result, fine = heat(c, peak, estimate_error=True), heat(c, peak, refine=3.0)
    error = abs(result.surface_rise / fine.surface_rise - 1)
    assert error <= 2 * result.surface_error + 5e-4
    assert error <= 5e-3


@EXAMPLES
@given(st.lists(conductors(), min_size=2, max_size=4))
def test_company_changes_nothing(drawn):
    """Scenarios of one call give what each gives alone."""
    names = drawn[0][0]
    together = {name: np.array([c[name] for c, _ in drawn]) for name in names}
    peaks = np.array([peak for _, peak in drawn])
    many = heat(together, peaks)
    for j, (c, peak) in enumerate(drawn):
        one = heat(c, peak)
        np.testing.assert_allclose(many.surface_rise[j], one.surface_rise, rtol=1e-9)
        np.testing.assert_allclose(many.mean_rise[j], one.mean_rise, rtol=1e-9)


@EXAMPLES
@given(conductors())
def test_the_current_is_carried_whole(drawn):
    """∮H at the surface is the current: the density, summed over the section, gives it back at any time."""
    c, peak = drawn
    c = c | {"inner_radius": 0.0, "resistivity": max(c["resistivity"], 1e-7)}
    at = 2 * c["front"]
    result = skin_heating(heidler(peak, c), **c, profile_times=[at], estimate_error=False)
    radii = result.profile_radii
    carried = np.trapezoid(result.profile_density[0] * 2 * np.pi * radii, radii)
    np.testing.assert_allclose(carried, heidler(peak, c)(np.array(at)), rtol=0.02)
