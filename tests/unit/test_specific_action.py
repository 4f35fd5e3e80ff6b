"""Specific action through phases: closed forms where they exist, an independent integration where they do not."""

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from strikeenergy.errors import InputError, MissingInput, OutsideValidity, UnknownName
from strikeenergy.physics import adiabatic
from strikeenergy.physics.specific_action import STATES, Metal, Phase, heating_table, melting_action
from strikeenergy.temperature_data import SET, Curve, coated, heating, metal_data, metals

C, LIQUID_C, RHO, RHO_L, LATENT, BOIL = 3.4e6, 4.0e6, 2e-8, 5e-8, 1.8e9, 4e10


def phase(low, high, heat, rho):
    return Phase(np.array([low, high]), np.array([heat, heat]), np.atleast_1d(rho) * np.ones(2))


def simple(rho=RHO, rho_l=RHO_L):
    """A metal of constant properties: melts at 1000 K, boils at 2000 K."""
    return Metal(
        (phase(200.0, 1000.0, C, rho), phase(1000.0, 2000.0, LIQUID_C, rho_l)),
        (("melting", LATENT),),
        ("vaporisation", BOIL),
    )


def test_constant_properties_give_the_closed_forms():
    table = heating_table(simple())
    melting, boiling = table.of("melting"), table.of("vaporisation")
    assert melting.start == pytest.approx(C * 800 / RHO, rel=1e-12)
    assert melting.end - melting.start == pytest.approx(
        LATENT * np.log(RHO_L / RHO) / (RHO_L - RHO), rel=1e-12
    )
    assert boiling.start - melting.end == pytest.approx(LIQUID_C * 1000 / RHO_L, rel=1e-12)
    assert boiling.end - boiling.start == pytest.approx(BOIL / (2 * RHO_L), rel=1e-12)
    assert table.action[-1] == pytest.approx(boiling.end, rel=1e-12)
    assert table.enthalpy[-1] == pytest.approx(C * 800 + LATENT + LIQUID_C * 1000 + BOIL, rel=1e-12)
    assert table.complete


def test_linear_resistivity_gives_the_law_of_the_standard():
    alpha, rise = 3.92e-3, np.array([10.0, 100.0, 500.0, 790.0])
    rho = RHO * np.array([1.0, 1 + alpha * 800])
    table = heating_table(simple(rho), step=1.0)
    law = adiabatic.ACTION_TO(C=C, alpha=alpha, rho0=RHO, rise=rise)
    np.testing.assert_allclose(table.action_at(200.0 + rise), law, rtol=1e-9)
    # Backwards, between the nodes: step²/(8·T) at most.
    np.testing.assert_allclose(table.temperature_at(law * 1.0001), 200 + rise, atol=0.2)
    between = 200.0 + np.array([0.5, 99.5, 499.5])
    exact = adiabatic.ACTION_TO(C=C, alpha=alpha, rho0=RHO, rise=between - 200)
    np.testing.assert_allclose(table.temperature_at(exact), between, atol=5e-4)


def test_melting_follows_its_own_differential_equation():
    table = heating_table(simple())
    plateau = table.of("melting")
    parts = np.linspace(0, 1, 11)
    # df/dG = ρ(f)/L with the two phases in series.
    done = solve_ivp(
        lambda g, f: (RHO + f * (RHO_L - RHO)) / LATENT,
        (0, plateau.end - plateau.start),
        [0.0],
        t_eval=parts * (plateau.end - plateau.start),
        rtol=1e-10,
        atol=1e-12,
    )
    g = plateau.start + parts * (plateau.end - plateau.start)
    np.testing.assert_allclose(table.melted_fraction(g), done.y[0], atol=1e-8)
    np.testing.assert_array_equal(table.temperature_at(g), 1000.0)
    np.testing.assert_allclose(table.enthalpy_of(g), C * 800 + LATENT * done.y[0], rtol=1e-9)


def test_equal_resistivities_are_the_limit_of_unequal_ones():
    assert melting_action(LATENT, RHO, RHO) == pytest.approx(LATENT / RHO, rel=1e-15)
    assert melting_action(LATENT, RHO, RHO * (1 + 1e-8)) == pytest.approx(LATENT / RHO, rel=1e-7)
    assert heating_table(simple(RHO, RHO)).of("melting").fraction(
        C * 800 / RHO + 0.25 * LATENT / RHO
    ) == pytest.approx(0.25)


def test_states_at_the_corners():
    table = heating_table(simple())
    melting, boiling = table.of("melting"), table.of("vaporisation")
    g = [
        0,
        melting.start,
        melting.start * 1.001,
        melting.end,
        boiling.start,
        boiling.start * 1.001,
        boiling.end * 2,
    ]
    words = [STATES[k] for k in table.state(np.array(g))]
    assert words == ["solid", "solid", "melting", "molten", "molten", "vaporised", "vaporised"]
    assert table.vaporised_fraction(boiling.end * 2) == 1.0
    # Beyond full vaporisation no temperature is invented.
    assert table.temperature_at(boiling.end * 2) == 2000.0


def test_vapour_carries_no_current():
    table = heating_table(simple())
    p = table.of("vaporisation")
    done = solve_ivp(
        lambda g, f: RHO_L / (1 - f) / BOIL, (0, 0.75 * (p.end - p.start)), [0.0], rtol=1e-10, atol=1e-12
    )
    assert table.vaporised_fraction(p.start + 0.75 * (p.end - p.start)) == pytest.approx(
        done.y[0, -1], abs=1e-7
    )
    assert done.y[0, -1] == pytest.approx(0.5, abs=1e-7)


def test_data_that_end_are_a_gap_and_not_a_result():
    short = Metal((phase(200.0, 1000.0, C, RHO),), (), ("melting", LATENT))
    table = heating_table(short)
    end = table.of("melting").end
    assert end == pytest.approx(C * 800 / RHO + LATENT / RHO, rel=1e-12)
    assert not table.complete
    assert table.melted_fraction(end) == 1.0
    for found in (table.temperature_at, table.melted_fraction, table.enthalpy_of, table.vaporised_fraction):
        assert np.isnan(found(end * 1.01))
    assert table.state(end * 1.01) == -1
    for whole in (table, heating_table(simple())):
        # What is not a number is no state either.
        assert whole.state(np.nan) == -1
        assert np.isnan(whole.melted_fraction(np.nan))
        assert np.isnan(whole.temperature_at(np.nan))
    for outside in (199.0, 1001.0, np.nan):
        with pytest.raises(OutsideValidity, match=r"200\.00 K to 1000\.00 K"):
            table.action_at(outside)


def test_two_halves_of_one_metal_are_that_metal():
    one, two = heating_table(simple()), heating_table([(0.3, simple()), (0.7, simple())])
    t = np.linspace(200, 2000, 50)
    keep = t != 1000
    np.testing.assert_allclose(two.enthalpy_at(t[keep]), one.enthalpy_at(t[keep]), rtol=1e-12)
    below = t < 1000
    np.testing.assert_allclose(two.action_at(t[below]), one.action_at(t[below]), rtol=1e-12)
    # At one melting point the layers melt one after the other, each beside the other as it then is.
    own = np.log(RHO_L / RHO) / (RHO_L - RHO)
    for layer, (share, beside) in enumerate([(0.3, 0.7 / RHO), (0.7, 0.3 / RHO_L)]):
        plateau = two.of("melting", layer)
        assert plateau.end - plateau.start == pytest.approx(
            share * LATENT * (beside + share * own), rel=1e-12
        )


def test_layers_in_parallel_against_an_independent_integration():
    core, coat = metal_data("carbon steel 0.06 % C"), metal_data("zinc")
    share = 0.1
    table = heating("galvanised steel", share)
    t = np.linspace(table.temperature[0], 690.0, 40001)
    heat, conductance = np.zeros(t.shape), np.zeros(t.shape)
    for part, data in ((1 - share, core), (share, coat)):
        c, r = data.curves["heat_capacity"], data.curves["resistivity"]
        heat += part * data["density"].value * np.interp(t, c.temperature, c.value)
        conductance += part / np.interp(t, r.temperature, r.value)
    assert table.action_at(690.0) == pytest.approx(np.trapezoid(heat * conductance, t), rel=1e-6)
    assert table.enthalpy_at(690.0) == pytest.approx(np.trapezoid(heat, t), rel=1e-6)


def test_a_coating_melts_and_boils_away_before_its_core():
    table = heating("galvanised steel", 0.1)
    order = [(p.kind, p.layer) for p in table.plateaus]
    assert order == [("melting", 1), ("vaporisation", 1), ("melting", 0), ("vaporisation", 0)]
    melting = table.of("melting", 1)
    f = np.linspace(0, 1, 21)
    # The inverse has no closed form here: it must still meet the law both ways.
    np.testing.assert_allclose(melting.fraction(melting.start + melting.action(f)), f, atol=1e-9)
    rho = metal_data("carbon steel 0.06 % C").curves["resistivity"]
    steel_beside = 0.9 / np.interp(692.73, rho.temperature, rho.value)
    own = 0.1 * np.log(37.4 / 16.3) / (37.4e-8 - 16.3e-8)
    latent = 0.1 * 7.322e3 / 65.38e-3 * 7134
    assert melting.end - melting.start == pytest.approx(latent * (steel_beside + own), rel=1e-9)
    boiling = table.of("vaporisation", 1)
    np.testing.assert_allclose(boiling.fraction(boiling.start + boiling.action(f)), f, atol=1e-9)
    assert STATES[int(table.state(boiling.end))] == "solid"
    assert STATES[int(table.state(boiling.end, layer=1))] == "vaporised"
    gained = table.enthalpy_of(melting.end) - table.enthalpy_of(melting.start)
    zinc = metal_data("zinc")
    assert gained == pytest.approx(0.1 * zinc["latent_heat"].value * zinc["density"].value, rel=1e-12)
    # Where the zinc is gone, the steel alone is left to carry the current.
    steel = heating("carbon steel 0.06 % C")
    above = table.action_at(1500.0) - table.action_at(1400.0)
    assert above == pytest.approx(0.9 * 0.9 * (steel.action_at(1500.0) - steel.action_at(1400.0)), rel=1e-9)


@pytest.mark.parametrize("name", [*metals(), *coated()])
def test_every_table_rises_and_is_frozen(name):
    table = heating(name)
    assert np.all(np.diff(table.action) > 0)
    assert np.all(np.diff(table.enthalpy) > 0)
    assert np.all(np.diff(table.temperature) >= 0)
    with pytest.raises(ValueError, match="read-only"):
        table.action[0] = 1.0


def test_bad_metals_and_layers_are_refused():
    with pytest.raises(ValueError, match="between every two phases"):
        Metal((phase(1.0, 2.0, C, RHO), phase(2.0, 3.0, C, RHO)))
    with pytest.raises(ValueError, match="begin where"):
        Metal((phase(1.0, 2.0, C, RHO), phase(2.5, 3.0, C, RHO)), (("melting", LATENT),))
    with pytest.raises(ValueError, match="positive"):
        Metal((phase(1.0, 2.0, C, -RHO),))
    with pytest.raises(ValueError, match="rising"):
        Metal((phase(2.0, 1.0, C, RHO),))
    with pytest.raises(ValueError, match="add up"):
        heating_table([(0.5, simple()), (0.4, simple())])
    other = Metal((phase(2500.0, 2600.0, C, RHO),))
    with pytest.raises(ValueError, match="in common"):
        heating_table([(0.5, simple()), (0.5, other)])


def test_every_number_has_source_and_standing():
    for data in metals().values():
        assert all(c.source.citation and c.source.locator for c in data.constants.values()), data.name
        for curve in data.curves.values():
            assert all(s.citation and s.locator for s in curve.sources), data.name
        assert data.note
    assert str(metal_data("stainless steel").standing) == "assumed"
    assert metal_data("copper").curves["heat_capacity"].standing.value == "published"


def test_what_the_set_lacks_is_named():
    with pytest.raises(MissingInput, match=f"{SET}.*emissivity.*of zinc"):
        metal_data("zinc")["emissivity"]
    with pytest.raises(UnknownName, match="copper"):
        metal_data("coper")
    with pytest.raises(UnknownName, match="galvanised steel"):
        heating("galvanized steel")
    with pytest.raises(InputError, match="no coating"):
        heating("copper", 0.1)
    with pytest.raises(InputError, match="between 0 and 1"):
        heating("galvanised steel", 1.5)


def test_a_curve_jumps_at_a_change_of_phase():
    heat: Curve = metal_data("titanium").curves["heat_capacity"]
    below, above = heat.between(1100.0, 1166.0), heat.between(1166.0, 1200.0)
    assert below[1][-1] / above[1][0] == pytest.approx(36.175 / 29.245, rel=1e-12)


@pytest.mark.parametrize("name", ["copper", "aluminium alloy", "galvanised steel", "copper-coated steel"])
def test_large_arrays_are_read_from_the_same_straight_lines(name):
    table = heating(name)
    g = np.random.default_rng(2).uniform(-0.05, 1.05, 100_000) * table.action[-1]
    g[:3] = np.nan, np.inf, 0.0
    g[3 : 3 + len(table.action)] = table.action
    right = None if table.complete else np.nan
    expected = np.interp(g, table.action, table.temperature, right=right)
    np.testing.assert_allclose(table.temperature_at(g), expected, rtol=1e-13)
    np.testing.assert_allclose(table.temperature_at(g.reshape(100, -1)).ravel(), expected, rtol=1e-13)


def test_the_heat_capacity_per_volume_for_cooling():
    copper = metal_data("copper")
    assert copper.capacity(298.15) == pytest.approx(8960 * 24.442 / 63.546e-3, rel=1e-12)
    np.testing.assert_allclose(
        copper.capacity([100.0, 2000.0]), 8960 / 63.546e-3 * np.array([22.631, 32.844])
    )
