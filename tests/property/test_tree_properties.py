"""What must hold for every tree and stroke: caps, sums, directions, arrays as loops, dimensions."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from strikeenergy.lightning.flash import Flash, Stroke
from strikeenergy.note import Formula, Note
from strikeenergy.physics import trunk
from strikeenergy.plugin import Bracket, Words
from strikeenergy.units import quantity
from strikeenergy.units import registry as unit_registry
from strikeenergy_tree import Tree, channel
from strikeenergy_tree.parameters import species_names
from strikeenergy_tree.stem import layers

QUIET = Note(quiet=True)
CLASSES = (
    "probability_none_visible",
    "probability_bark_loss",
    "probability_wood_loss",
    "probability_explosive",
)
FINDINGS = ("channel_energy_per_length", "bark_speed", "energy_before_flashover_per_length", *CLASSES)


def spread(low, high):
    """Draw evenly in the logarithm."""
    return st.floats(np.log10(low), np.log10(high)).map(lambda x: float(10**x))


diameters = spread(0.05, 3.0)
conditions = st.sampled_from(["sound", "crack", "rot", "old scar"])
bark = st.sampled_from(["dry", "wet"])


@st.composite
def trees(draw, **fixed):
    fields = {
        "species": draw(st.sampled_from(species_names())),
        "diameter": f"{draw(diameters):.6g} m",
        "bark": draw(bark),
        "condition": draw(conditions),
        "height": draw(st.sampled_from([None, "5 m", "20 m", "60 m", "110 m"])),
        "start": f"{draw(st.floats(-20, 45)):.3f} degC",
    }
    return {name: value for name, value in {**fields, **fixed}.items() if value is not None}


@st.composite
def impulses(draw, most=200e3):
    """Draw an impulse that a current can have, up to the first impulse of LPL I."""
    peak = draw(spread(10.0, most))
    charge = draw(st.floats(1e-6, 5e-4)) * peak
    energy = draw(st.floats(0.05, 1.0)) * peak * charge
    return {"peak": peak, "charge": charge, "specific_energy": energy}


def run(tree, **stroke):
    return channel(Tree(**tree), Flash((Stroke(**stroke),)))


def marks(found):
    """Return the probabilities of at least bark loss, wood loss, explosion."""
    none, bark_loss, wood_loss, explosive = (getattr(found, name) for name in CLASSES)
    assert np.allclose(none + bark_loss + wood_loss + explosive, 1, rtol=0, atol=1e-12)
    return bark_loss + wood_loss + explosive, wood_loss + explosive, explosive


@given(trees(), impulses())
def test_probabilities_sum_to_one_and_brackets_hold_the_value(tree, stroke):
    found = run(tree, **stroke)
    marks(found)
    paths = [found.path_surface, found.path_under_bark, found.path_deep]
    assert abs(sum(path.value for path in paths) - 1) < 1e-12
    for name in vars(found):
        value = getattr(found, name)
        if isinstance(value, Bracket):
            assert 0 <= value.low <= value.value * (1 + 1e-12), name
            assert value.value <= value.high * (1 + 1e-12), name
    assert found.damage_class in trunk.CLASSES


@given(trees(), spread(1.0, 1e6))
def test_field_and_current_inside_are_never_above_the_cap(tree, current):
    r = layers(Tree(**tree), QUIET).resistance.value
    found = run(tree, peak=current, charge=1e-5 * current, specific_energy=5e-6 * current**2)
    cap = found.flashover_current.value * r
    field = trunk.INTERNAL_FIELD(r=r, i=current, E_fo=cap)
    assert field <= cap
    assert field / r <= found.flashover_current.value * (1 + 1e-12)
    if found.energy_before_flashover_per_length is not None:
        slowest = 110.0 / 1e6
        assert (
            found.energy_before_flashover_per_length.high
            <= 500e3**2 * slowest / layers(Tree(**tree), QUIET).resistance.low
        )


@given(trees(height="20 m"), impulses())
def test_a_trunk_of_20_m_takes_less_than_a_tenth_of_a_flash(tree, stroke):
    # Charge and W/R here are within those of LPL I.
    found = run(tree, **stroke).channel_energy_per_length
    assert 20 * found.value < 0.1 * 1e9
    assert 20 * found.high <= 1e9 * (1 + 1e-12)


@given(trees(height="110 m"))
def test_no_trunk_takes_more_than_a_flash_has(tree):
    found = run(tree, peak=200e3, charge=100.0, specific_energy=1e7).channel_energy_per_length
    assert 110 * found.high <= 1e9 * (1 + 1e-12)


@given(trees(), impulses(), st.floats(1.0, 5.0))
def test_severity_never_falls_with_charge_or_specific_energy(tree, stroke, factor):
    # Without a peak, so that every pair of charge and W/R is possible.
    base = {"charge": stroke["charge"], "specific_energy": stroke["specific_energy"]}
    less = run(tree, **base)
    for name in base:
        more = run(tree, **{**base, name: factor * base[name]})
        assert more.channel_energy_per_length.value >= less.channel_energy_per_length.value
        assert more.bark_speed.value >= less.bark_speed.value
        assert all(b >= a - 1e-12 for a, b in zip(marks(less), marks(more), strict=True))


@given(trees(), impulses())
def test_rain_never_draws_the_arc_inside_and_never_worsens_the_damage(tree, stroke):
    dry, wet = run({**tree, "bark": "dry"}, **stroke), run({**tree, "bark": "wet"}, **stroke)
    assert wet.path_surface.value >= dry.path_surface.value
    assert wet.path_surface.low >= dry.path_surface.low
    if stroke["peak"] > max(dry.flashover_current.value, wet.flashover_current.value):
        assert all(b <= a + 1e-12 for a, b in zip(marks(dry), marks(wet), strict=True))


@given(trees(), st.floats(1.001, 3.0), st.floats(0.0, 60.0), st.floats(0.5, 20.0))
def test_resistance_falls_with_diameter_and_temperature(tree, factor, start, warmer):
    thick = {**tree, "diameter": f"{factor * float(tree['diameter'].split()[0]):.9g} m"}
    assert (
        run(thick, charge=1.0, specific_energy=1e3).flashover_current.value
        > run(tree, charge=1.0, specific_energy=1e3).flashover_current.value
    )
    at = [
        layers(Tree(**{**tree, "start": f"{t:.6f} degC"}), QUIET).resistance.value
        for t in (start, start + warmer)
    ]
    assert at[1] < at[0]


@given(trees(), st.floats(15.0, 40.0), st.floats(1.0, 20.0))
def test_resistance_falls_with_sapwood(tree, sapwood, wider):
    # Rot conducts better than sapwood, so only sound wood.
    tree = {**tree, "condition": "sound", "diameter": "0.5 m"}
    at = [
        layers(Tree(**tree, sapwood_thickness=f"{t} mm"), QUIET).resistance.value
        for t in (sapwood, sapwood + wider)
    ]
    assert at[1] < at[0]


@given(trees(), impulses(), st.floats(0.0, 0.05))
def test_speed_falls_to_nothing_with_the_yield(tree, stroke, eta):
    def speed(value):
        return run({**tree, "assume": {"mechanical_yield": value}}, **stroke).bark_speed.value

    assert speed(eta) <= speed(0.05)
    assert speed(0) == 0
    assert speed(eta) <= 60


@given(trees(), st.lists(impulses(), min_size=1, max_size=6))
def test_an_array_of_strokes_is_a_loop_over_them(tree, strokes):
    many = run(tree, **{name: np.array([stroke[name] for stroke in strokes]) for name in strokes[0]})
    loop = [run(tree, **stroke) for stroke in strokes]
    compare(many, loop)


@given(trees(), st.lists(diameters, min_size=1, max_size=5), impulses())
def test_an_array_of_trees_is_a_loop_over_them(tree, sizes, stroke):
    many = channel(Tree(**{**tree, "diameter": quantity(np.array(sizes), "m")}), Flash((Stroke(**stroke),)))
    loop = [
        channel(Tree(**{**tree, "diameter": quantity(size, "m")}), Flash((Stroke(**stroke),)))
        for size in sizes
    ]
    compare(many, loop)


@given(trees(), st.lists(st.tuples(impulses(), st.sampled_from([1e-4, 0.5])), min_size=1, max_size=5))
def test_continuing_current_is_left_out_element_by_element(tree, drawn):
    def stroke(item):
        values, duration = item
        energy = max(values["specific_energy"], values["charge"] ** 2 / duration * 1.01)
        return {"charge": values["charge"], "specific_energy": energy, "duration": duration}

    strokes = [stroke(item) for item in drawn]
    many = run(tree, **{name: np.array([s[name] for s in strokes]) for name in strokes[0]})
    for index, s in enumerate(strokes):
        alone, energy = run(tree, **s), many.channel_energy_per_length.value[index]
        if s["duration"] > 2e-3:  # alone it is not in the model; among others it adds nothing
            assert alone.damage_class is None
            assert energy == 0
        else:
            assert many.damage_class.names[many.damage_class.codes[index]] == alone.damage_class
            assert energy == pytest.approx(alone.channel_energy_per_length.value, rel=1e-12) != 0


def compare(many, loop):
    assert isinstance(many.damage_class, Words)
    assert [many.damage_class.names[code] for code in many.damage_class.codes] == [
        one.damage_class for one in loop
    ]
    for name in FINDINGS:
        value, each = getattr(many, name), [getattr(one, name) for one in loop]
        if value is None:
            assert not any(each)
        elif isinstance(value, Bracket):
            for end in ("value", "low", "high"):
                np.testing.assert_allclose(
                    np.broadcast_to(getattr(value, end), len(loop)),
                    [getattr(one, end) for one in each],
                    rtol=1e-12,
                )
        else:
            np.testing.assert_allclose(np.broadcast_to(value, len(loop)), each, rtol=1e-12, atol=1e-15)


# --- dimensions of the laws -------------------------------------------------------------------------------

UNITS = {
    "t_0": "m", "k_b": "", "D": "m", "r_o": "m", "r_i": "m", "A": "m", "rho": "ohm*m", "k": "", "g": "S*m", "g_k": "S*m",
    "r": "ohm/m", "E_fo": "V/m", "E": "V/m", "i": "A", "i_fo": "A", "S": "A/s", "t_fo": "s", "h": "m", "u": "m/s", "E_int": "V/m",
    "E_surf": "V/m", "n": "", "E_ch": "V/m", "r_ch": "ohm/m", "Q": "C", "W": "J/ohm", "U": "J", "rho_w": "kg/m**3", "G_b": "", "M": "",
    "rho_b": "kg/m**3", "rho_s": "kg/m**3", "rho_h": "kg/m**3", "t_b": "m", "b": "m", "d": "m", "A_b": "m**2", "A_p": "m**2",
    "A_s": "m**2", "A_h": "m**2", "G": "J/m**2", "m": "kg/m", "v": "m/s", "eta": "", "w": "J/m", "v_max": "m/s", "g_b": "S*m",
    "g_p": "S*m", "g_s": "S*m", "g_h": "S*m", "alpha": "1/K", "T": "K", "T_r": "K", "T_m": "K", "T_lo": "K", "T_hi": "K",
}  # fmt: skip
RESULTS = {
    "BARK_THICKNESS": "m",
    "LAYER_AREA": "m**2",
    "TEMPERATURE_FACTOR": "",
    "CONDUCTANCE_OF": "S*m",
    "CONDUCTANCE": "S*m",
    "RESISTANCE": "ohm/m",
    "SHARE": "",
    "INTERNAL_FIELD": "V/m",
    "FLASHOVER_CURRENT": "A",
    "FLASHOVER_TIME": "s",
    "ENERGY_ON_FRONT": "J/m",
    "ENERGY_DURING_LAG": "J/m",
    "PROBABILITY_INTERNAL": "",
    "CHANNEL_ENERGY": "J/m",
    "CHANNEL_ENERGY_LIMITED": "J/m",
    "GREEN_DENSITY": "kg/m**3",
    "STRIP_MASS": "kg/m",
    "SLAB_MASS": "kg/m",
    "TRUNK_MASS": "kg/m",
    "EJECTION_ENERGY": "J/m",
    "EJECTION_SPEED": "m/s",
}
LAWS = {name: law for name, law in vars(trunk).items() if isinstance(law, Formula)}


@pytest.mark.parametrize("name", sorted(LAWS))
def test_dimension(name):
    ureg = unit_registry()
    units = {**UNITS, **({"A": "m**2"} if name == "CONDUCTANCE_OF" else {})}
    values = {
        n: ureg.Quantity(2.0 + 0.1 * k, units[n] or "dimensionless") for k, n in enumerate(LAWS[name].names)
    }
    found = LAWS[name](**values)
    assert ureg.Quantity(1.0, RESULTS[name] or "dimensionless").is_compatible_with(found)
