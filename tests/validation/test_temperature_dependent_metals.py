"""NIST-JANAF, EN 1993-1-2 and the exploding-wire literature against the temperature-dependent set.

M. W. Chase (ed.), NIST-JANAF Thermochemical Tables, 4th ed. (1998): enthalpies H(T) − H(298.15 K), retyped here and held
against what the set integrates. The open library ``chemicals`` carries the NIST WebBook equations: an independent way to
the same enthalpies. EN 1993-1-2:2005, 3.4.1.2 and Annex C: specific heats of steels at single temperatures, recomputed from
the print by hand. R. A. Matula (1979) and P. D. Desai et al. (1984): cubic fits of the recommended resistivities.

Specific actions: to the explosion of copper wires 2.1e5 A²·s/mm⁴ (Scientific Reports 2025), of copper and aluminium 1.95e5 and
1.09e5 (reviews of pulsed power, 1970 to 1990; from memory, medium confidence). The other specific actions and the rises were
worked out beforehand, outside of this program, from the same publications by another integration: they hold the code, not
the metals, at the uncertainty stated for them (4 % copper and aluminium, 8 % iron and zinc, 10 % lead).
"""

import numpy as np
import pytest

from strikeenergy.materials import Materials
from strikeenergy.physics import adiabatic
from strikeenergy.temperature_data import heating, metal_data, metals

START = 293.15

JANAF = {  # kJ/mol above 298.15 K: solid at the melting point, liquid there, liquid at the boiling point, gas there
    "copper": (1358.0, 29.660, 42.798, 2843.261, 91.580, 392.257),
    "aluminium": (933.45, 17.982, 28.693, 2790.812, 87.665, 381.667),
    "iron": (1809.0, 58.645, 72.452, 3133.345, 133.404, 482.989),
    "zinc": (692.73, 10.825, 18.147, 1180.173, 33.443, 148.754),
    "lead": (600.6, 8.499, 13.273, 2019.022, 54.758, 232.340),
    "titanium": (1939.0, 55.394, 69.540, 3630.956, 149.463, 559.447),
}


def specific(name, per_volume):
    return per_volume / metal_data(name)["density"].value


@pytest.mark.parametrize("name", JANAF)
def test_enthalpies_of_janaf(name):
    melting, solid, liquid, boiling, hot, gas = JANAF[name]
    table, molar = heating(name), metal_data(name)["molar_mass"].value
    on = table.of("melting")
    zero = table.enthalpy_at(298.15)
    assert on.temperature == melting
    assert table.of("vaporisation").temperature == boiling
    held = [
        table.enthalpy_at(melting),
        table.enthalpy_of(on.end),
        table.enthalpy_at(boiling),
        table.enthalpy[-1],
    ]
    found = [specific(name, h - zero) * molar / 1e3 for h in held]
    # 0.3 %: straight lines between values 100 K apart. 1 % is what is asked.
    assert found == pytest.approx([solid, liquid, hot, gas], rel=3e-3)


@pytest.mark.parametrize(
    ("name", "points"),
    [
        (
            "iron",
            {400: 2.674, 600: 8.613, 800: 15.553, 1000: 24.329, 1042: 26.960, 1100: 29.972, 1400: 42.033},
        ),
        ("titanium", {400: 2.660, 800: 14.039, 1100: 23.466, 1200: 30.961, 1700: 46.778}),
        ("copper", {400: 2.539, 800: 13.123, 1200: 24.633}),
    ],
)
def test_enthalpies_on_the_way(name, points):
    table, molar = heating(name), metal_data(name)["molar_mass"].value
    for t, h in points.items():
        found = specific(name, table.enthalpy_at(t) - table.enthalpy_at(298.15)) * molar / 1e3
        assert found == pytest.approx(h, rel=4e-3), t


@pytest.mark.parametrize(
    ("name", "cas"),
    [("copper", "7440-50-8"), ("aluminium", "7429-90-5"), ("zinc", "7440-66-6"), ("lead", "7439-92-1")],
)
def test_enthalpy_to_the_melt_against_the_webbook(name, cas):
    chemicals = pytest.importorskip("chemicals")
    law = chemicals.heat_capacity.WebBook_Shomate_solids[cas]
    a, b, c, d, e = law.coeffs
    melting = metal_data(name)["melting_temperature"].value

    def enthalpy(t):
        return a * t + b * t**2 / 2 + c * t**3 / 3 + d * t**4 / 4 - e / t

    fusion = chemicals.phase_change.Hfus(cas, method="CRC")
    table, molar = heating(name), metal_data(name)["molar_mass"].value
    sensible = enthalpy(melting) - enthalpy(298.15)
    zero = table.enthalpy_at(298.15)
    assert specific(name, table.enthalpy_at(melting) - zero) * molar == pytest.approx(sensible, rel=0.01)
    whole = specific(name, table.enthalpy_of(table.of("melting").end) - zero) * molar
    # 1 % on the whole heat to the melt; zinc's heat of fusion differs by 3.5 % between JANAF and the handbook.
    assert whole == pytest.approx(sensible + fusion, rel=0.015 if name == "zinc" else 0.01)


@pytest.mark.parametrize(
    ("name", "values"),
    [
        ("carbon steel 0.06 % C", {20: 439.8, 100: 487.6, 200: 529.8, 400: 605.9, 600: 760.2, 700: 1008.2, 735: 5000, 800: 803.3, 1000: 650}),
        ("stainless steel", {20: 455.5, 100: 475.2, 400: 524.0, 800: 556.4}),
    ],
)  # fmt: skip
def test_heat_capacities_of_steels(name, values):
    curve = metal_data(name).curves["heat_capacity"]
    for celsius, value in values.items():
        assert np.interp(celsius + 273.15, curve.temperature, curve.value) == pytest.approx(
            value, rel=4e-4
        ), celsius


def test_enthalpies_of_carbon_steel():
    table = heating("carbon steel 0.23 % C")
    for celsius, kilojoule in ((600, 335.7), (735, 475.4), (900, 632.1), (1200, 827.1)):
        found = specific(
            "carbon steel 0.23 % C", table.enthalpy_at(celsius + 273.15) - table.enthalpy_at(START)
        )
        assert found == pytest.approx(kilojoule * 1e3, rel=1e-3)


@pytest.mark.parametrize(
    ("name", "cubic", "to", "within"),
    [
        ("copper", (1.67848, 6.75578e-3, 1.35574e-7, 9.52369e-10), 1357, 1e-3),
        ("aluminium", (2.65355, 1.16010e-2, -3.03965e-6, 7.20129e-9), 900, 4e-3),
    ],
)
def test_resistivities_against_their_fits(name, cubic, to, within):
    curve = metal_data(name).curves["resistivity"]
    t = np.linspace(293.15, to, 100)
    fit = np.polynomial.polynomial.polyval(t - 293.15, cubic) * 1e-8
    # The fit's own error, and straight lines between nodes 100 K apart.
    np.testing.assert_allclose(np.interp(t, curve.temperature, curve.value), fit, rtol=within + 1.5e-3)


def test_the_jump_of_the_resistivity_on_melting():
    for name in ("copper", "aluminium", "zinc", "lead", "tin"):
        plateau = heating(name).of("melting")
        assert 1.9 < plateau.after / plateau.before < 2.4, name
    iron = heating("iron").of("melting")
    assert 1.0 < iron.after / iron.before < 1.15


@pytest.mark.parametrize(
    ("name", "onset", "full", "within"),
    [
        ("copper", 91100, 103500, 0.04),
        ("aluminium", 31550, 37900, 0.04),
        ("iron", 14860, 16300, 0.08),
        ("zinc", 11900, 15000, 0.08),
        ("lead", 1470, 1840, 0.10),
    ],
)
def test_specific_action_to_melting(name, onset, full, within):
    table = heating(name)
    melting, zero = table.of("melting"), table.action_at(START)
    assert (melting.start - zero) / 1e12 == pytest.approx(onset, rel=within)
    assert (melting.end - zero) / 1e12 == pytest.approx(full, rel=within)


@pytest.mark.parametrize(
    ("name", "literature"), [("copper", (1.95e5, 2.1e5)), ("aluminium", (1.09e5, 1.09e5))]
)
def test_wires_explode_on_or_just_after_the_boiling_plateau(name, literature):
    boiling, zero = heating(name).of("vaporisation"), heating(name).action_at(START)
    # If the vapour kept on conducting like the liquid, the plateau would take twice as long: the two models bracket it.
    conducting = boiling.end + (boiling.end - boiling.start)
    for value in literature:
        assert (boiling.start - zero) / 1e12 < value < (conducting - zero) / 1e12


@pytest.mark.parametrize(
    ("name", "q", "rises"),
    [
        ("copper", 16, {2.5: 51.5, 5.6: 129.4, 10: 271.7}),
        ("copper", 10, {5.6: 459.5}),
        ("aluminium", 25, {2.5: 46.7, 5.6: 116.8, 10: 239.6}),
        ("aluminium", 10, {2.5: 446.6}),
        ("carbon steel 0.23 % C", 25, {2.5: 249.9, 5.6: 772}),
        ("carbon steel 0.06 % C", 25, {2.5: 193, 5.6: 676}),
        ("carbon steel 0.23 % C", 50, {2.5: 51.6, 5.6: 123.8, 10: 249.9}),
        ("carbon steel 0.06 % C", 50, {2.5: 39.8, 5.6: 95.9, 10: 193.4}),
        ("stainless steel", 50, {2.5: 209, 5.6: 497, 10: 948}),
    ],
)
def test_rises(name, q, rises):
    table = heating(name)
    w = np.array(list(rises)) * 1e6
    found = table.temperature_at(table.reached(w, q * 1e-6, START)) - START
    np.testing.assert_allclose(found, list(rises.values()), rtol=0.02)


def test_where_the_standard_is_on_the_safe_side_and_where_not():
    """IEC 62305-1 Table D.2 against this set: conservative for copper and aluminium, not for steel of 0.23 % carbon."""

    def standard(name, q, w):
        m = Materials().get(name)
        c = m["density"].value * m["heat_capacity"].value
        return adiabatic.RISE(
            w=w, alpha=m["temperature_coefficient"].value, rho0=m["resistivity"].value, q=q, C=c
        )

    def ours(name, q, w):
        return float(heating(name).temperature_at(heating(name).reached(w, q, START))) - START

    assert ours("copper", 16e-6, 10e6) / standard("copper", 16e-6, 10e6) == pytest.approx(0.88, abs=0.01)
    assert ours("aluminium", 25e-6, 10e6) / standard("aluminium", 25e-6, 10e6) == pytest.approx(
        0.85, abs=0.01
    )
    ratio = ours("carbon steel 0.23 % C", 50e-6, 2.5e6) / standard("mild steel", 50e-6, 2.5e6)
    assert ratio == pytest.approx(1.39, abs=0.02)


def test_stainless_steel_meets_where_two_publications_do():
    # 304L by pulse heating above 1400 K; tables of 18/8 steel below 1273 K: no step between them.
    curve = metal_data("stainless steel").curves["resistivity"]
    t = np.array([1273.15, 1400.0, 1700.0])
    assert np.interp(t, curve.temperature, curve.value) * 1e8 == pytest.approx(
        [119.6, 122.52, 127.68], rel=1e-3
    )
    heat = metal_data("stainless steel").curves["heat_capacity"]
    assert np.interp(1399, heat.temperature, heat.value) == pytest.approx(
        np.interp(1400, heat.temperature, heat.value), rel=0.15
    )


def test_titanium_at_room_temperature_and_its_change_of_phase():
    curve = metal_data("titanium").curves["resistivity"]
    # Grades 1 and 2 of the trade run 45 to 56 uohm*cm, pure titanium 42 to 45.
    assert 42e-8 < np.interp(293.15, curve.temperature, curve.value) < 46e-8
    change = heating("titanium").of("transition")
    assert change.temperature == 1166.0
    assert change.after / change.before == pytest.approx(0.91, abs=0.005)


def test_names_of_the_set():
    due = {
        "copper",
        "aluminium",
        "aluminium alloy",
        "carbon steel 0.06 % C",
        "carbon steel 0.23 % C",
        "stainless steel",
    }
    assert due | {"titanium", "zinc", "lead", "tin", "brass"} <= set(metals())
