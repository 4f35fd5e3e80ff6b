"""Invariants of heating through phases and of cooling, over physical ranges and every metal of the set."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from strikeenergy.physics.cooling import Air, Layer, Surrounded, after_strokes
from strikeenergy.temperature_data import coated, heating, metal_data, metals

names = st.sampled_from([*metals(), *coated()])
pure = st.sampled_from([n for n in metals() if heating(n).complete])
units = st.floats(0.0, 1.0)
starts = st.floats(260.0, 350.0)
CU = 3.45e6


def at(table, part):
    """Return a specific action at a part of the table's range, dense where it is small."""
    return part**3 * table.action[-1]


@given(names, units)
def test_round_trip_through_the_action(name, part):
    table = heating(name)
    t = table.temperature[0] + part * (table.temperature[-1] - table.temperature[0])
    assert table.temperature_at(table.action_at(t)) == pytest.approx(t, rel=1e-10)


@given(names, units, units)
def test_monotone(name, a, b):
    table = heating(name)
    low, high = sorted((at(table, a), at(table, b)))
    assert table.temperature_at(low) <= table.temperature_at(high)
    assert table.enthalpy_of(low) <= table.enthalpy_of(high) * (1 + 1e-12)
    assert table.melted_fraction(low) <= table.melted_fraction(high)
    assert table.state(low) <= table.state(high)


@given(pure, units)
def test_a_fraction_between_0_and_1_means_the_melting_point(name, part):
    table = heating(name)
    plateau = table.of("melting")
    # Half of the draws on the plateau, the others anywhere.
    g = at(table, 2 * part) if part < 0.5 else plateau.start + (2 * part - 1) * (plateau.end - plateau.start)
    f, t = float(table.melted_fraction(g)), float(table.temperature_at(g))
    assert 0 <= f <= 1
    if 1e-9 < f < 1 - 1e-9:
        assert t == pytest.approx(metal_data(name)["melting_temperature"].value, rel=1e-12)
        assert int(table.state(g)) == 1
    elif 0 < abs(t - metal_data(name)["melting_temperature"].value) > 1e-6:
        assert f in (0.0, 1.0)


@given(names, starts, st.floats(1e13, 1e16), st.floats(1e13, 1e16))
def test_two_strokes_are_one_in_any_order(name, start, a, b):
    table = heating(name)

    def heat(t, g):
        return table.temperature_at(table.action_at(t) + g)

    if table.action_at(start) + a + b > table.of("melting", len(table.plateaus) > 4).start:
        a, b = a * 1e-3, b * 1e-3
    once = heat(start, a + b)
    assert heat(heat(start, a), b) == pytest.approx(once, rel=1e-9)
    assert heat(heat(start, b), a) == pytest.approx(once, rel=1e-9)


@given(st.sampled_from(["copper", "aluminium"]), starts, st.floats(2.5, 100.0), st.floats(1e15, 1e16))
def test_a_hotter_start_gives_a_larger_rise(name, start, more, g):
    table = heating(name)

    def rise(t):
        return float(table.temperature_at(table.action_at(t) + g)) - t

    assert rise(start + more) > rise(start)


@given(names, starts, st.floats(1e3, 1e7), st.floats(4e-6, 2e-4), st.integers(2, 6))
def test_parallel_paths_share(name, start, w, q, n):
    table = heating(name)
    whole, one = table.reached(w, q, start), table.reached(w / n**2, q / n, start)
    assert one == pytest.approx(float(whole), rel=1e-12)


@given(pure)
def test_onset_full_melting_and_explosion_come_in_this_order(name):
    table = heating(name)
    melting, boiling = table.of("melting"), table.of("vaporisation")
    assert melting.start < melting.end < boiling.start < boiling.end


@given(st.floats(1e14, 2.4e16))
def test_order_of_the_metals(g):
    order = ["copper", "aluminium", "carbon steel 0.06 % C", "stainless steel"]
    melting = [heating(n).of("melting").start - heating(n).action_at(293.15) for n in order]
    assert melting == sorted(melting, reverse=True)
    copper, aluminium = (
        float(heating(n).temperature_at(heating(n).action_at(293.15) + g)) for n in ("copper", "aluminium")
    )
    assert copper < aluminium


@given(names, st.lists(units, min_size=1, max_size=20))
def test_arrays_give_what_numbers_give_in_any_order(name, parts):
    table = heating(name)
    g = at(table, np.array(parts))
    for law in (table.temperature_at, table.enthalpy_of, table.melted_fraction, table.state):
        both = law(g)
        np.testing.assert_allclose(both, [law(x) for x in g], rtol=1e-12)
        np.testing.assert_allclose(law(g[::-1])[::-1], both, rtol=1e-12)


@given(names, units)
def test_energy_and_action_belong_together(name, part):
    """Between two neighbouring actions the mean conductivity lies between 1/ρ and what a metal can be."""
    table = heating(name)
    g = at(table, 0.01 + 0.98 * part)
    slope = (table.enthalpy_of(g * 1.0005) - table.enthalpy_of(g * 0.9995)) / (
        0.001 * g
    )  # dH/dG: the resistivity
    assert 5e-9 < slope < 1e-4


def bodies():
    air = st.builds(
        lambda d, e, wind: Air(CU, d / 4, d, e, wind=wind),
        st.floats(5e-4, 3e-2), st.floats(0.02, 0.95), st.sampled_from([0.0, 0.5, 10.0]),
    )  # fmt: skip
    ground = st.builds(
        lambda r, k, c: Surrounded(r, CU, [Layer(np.inf, k, c)]),
        st.floats(1e-3, 1e-2), st.floats(0.2, 3.0), st.floats(1e6, 3e6),
    )  # fmt: skip
    cable = st.builds(
        lambda r, k, s, h: Surrounded(r, CU, [Layer(r + s, k, 1.9e6)], h=h),
        st.floats(1e-3, 1e-2), st.floats(0.1, 0.4), st.floats(2e-4, 5e-3), st.floats(5.0, 50.0),
    )  # fmt: skip
    return st.one_of(air, ground, cable)


@given(bodies(), st.floats(300.0, 1300.0), st.lists(st.floats(0.0, 5e4), min_size=2, max_size=10))
def test_the_adiabatic_temperature_is_an_upper_bound_at_every_time(body, hot, times):
    course = body.history(hot, np.sort(times))
    assert np.all(course <= hot * (1 + 1e-12))
    assert np.all(course >= body.ambient - 1e-9 * hot)
    assert np.all(np.diff(course) <= 1e-9 * hot)


@given(bodies(), st.lists(st.floats(1e14, 8e15), min_size=2, max_size=4), st.floats(1e-3, 1e4))
def test_cooling_between_strokes_never_heats(body, actions, gap):
    table = heating("copper")
    _, after = after_strokes(
        lambda t, g: table.temperature_at(table.action_at(t) + g),
        body,
        actions,
        [gap] * (len(actions) - 1),
        293.15,
    )
    together = table.temperature_at(table.action_at(293.15) + np.cumsum(actions))
    assert np.all(np.array(after) <= together * (1 + 1e-9))


@given(bodies(), st.floats(500.0, 1300.0), st.floats(0.2, 0.8))
def test_time_above_ends_where_the_history_crosses(body, hot, part):
    limit = 293.15 + part * (hot - 293.15)
    seconds = body.time_above(hot, limit)
    assert body.history(hot, [float(seconds)])[0] == pytest.approx(limit, abs=2e-3 * (hot - 293.15))


@given(st.floats(5e-4, 3e-2), st.floats(0.02, 0.9), st.floats(320.0, 1300.0), st.floats(1.0, 5000.0))
def test_wind_and_a_dull_surface_cool_faster(d, emissivity, hot, time):
    still = Air(CU, d / 4, d, emissivity)
    assert Air(CU, d / 4, d, emissivity, wind=20.0).after(hot, time) <= still.after(hot, time) + 1e-9
    assert Air(CU, d / 4, d, emissivity + 0.05).after(hot, time) <= still.after(hot, time) + 1e-9
