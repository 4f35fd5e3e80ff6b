"""Invariants of adiabatic heating and of forces, over physical ranges. Similarity laws are paired with closures."""

import math

import numpy as np
import pytest
from hypothesis import assume, example, given
from hypothesis import strategies as st
from scipy.integrate import solve_ivp

from strikeenergy import quantity
from strikeenergy.lightning.flash import Flash, Stroke
from strikeenergy.physics import adiabatic, arcroot, magnetics
from strikeenergy_conductor import Conductor, forces, heating


def log_uniform(low, high):
    return st.floats(math.log10(low), math.log10(high)).map(lambda x: 10**x)


metals = st.sampled_from(["copper", "aluminium", "mild steel", "stainless steel"])
energies = log_uniform(1e2, 3e7)
sections = log_uniform(4e-6, 2e-4)
starts = st.floats(250.0, 350.0)
lengths = log_uniform(1e-2, 1e2)
currents = log_uniform(1e2, 3e5)


def conductor(metal, section, start=293.15, **more):
    return Conductor(material=metal, section=quantity(section, "m**2"), start=quantity(start, "K"), **more)


def heat(metal, section, energy, start=293.15):
    return heating(conductor(metal, section, start), Flash((Stroke(specific_energy=energy),)))


def rise(metal, section, energy, start=293.15):
    value = heat(metal, section, energy, start).temperature_rise
    assume(value is not None)
    return float(value)


@given(metals, sections, energies, st.integers(2, 6))
@example("copper", 16e-6, 10e6, 2)
def test_parallel_paths(metal, section, energy, n):
    assert rise(metal, section, energy) == pytest.approx(rise(metal, section / n, energy / n**2), rel=1e-9)


@given(metals, sections, energies, st.floats(0.3, 3.0))
def test_only_energy_over_section_squared_counts(metal, section, energy, k):
    assert rise(metal, section, energy) == pytest.approx(rise(metal, section * k, energy * k**2), rel=1e-9)


@given(metals, sections, energies, st.floats(1.001, 2.0))
def test_strictly_monotone(metal, section, energy, k):
    assert rise(metal, section, energy * k) > rise(metal, section, energy)
    assert rise(metal, section * k, energy) < rise(metal, section, energy)


@given(metals, sections, energies)
def test_at_least_that_of_constant_resistivity(metal, section, energy):
    found = conductor(metal, section).substance
    c = found["density"].value * found["heat_capacity"].value
    least = adiabatic.RISE_CONSTANT(w=energy, rho0=found["resistivity"].value, q=section, C=c)
    assert rise(metal, section, energy) >= least * (1 - 1e-12)


@given(metals, sections, energies, st.floats(0.05, 0.95), starts)
def test_strokes_one_after_another(metal, section, energy, part, start):
    whole = heat(metal, section, energy, start)
    assume(whole.temperature_rise is not None)
    first = heat(metal, section, energy * part, start)
    second = heat(metal, section, energy * (1 - part), float(first.end_temperature))
    assert second.end_temperature == pytest.approx(whole.end_temperature, rel=1e-9)


@given(metals, sections, energies, starts, st.floats(1.0, 50.0))
def test_hotter_start_rises_more(metal, section, energy, start, more):
    assert rise(metal, section, energy, start + more) > rise(metal, section, energy, start)


@given(metals, sections, energies, starts)
def test_round_trip(metal, section, energy, start):
    found = heat(metal, section, energy, start)
    assume(found.temperature_rise is not None)
    metal_ = conductor(metal, section).substance
    at = {
        "T": start,
        "T_r": metal_["reference_temperature"].value,
        "alpha_r": metal_["temperature_coefficient"].value,
    }
    back = adiabatic.ACTION_TO(
        C=metal_["density"].value * metal_["heat_capacity"].value,
        alpha=adiabatic.COEFFICIENT_AT(**at),
        rho0=adiabatic.RESISTIVITY_AT(rho_r=metal_["resistivity"].value, **at),
        rise=float(found.temperature_rise),
    )
    assert back * section**2 == pytest.approx(energy, rel=1e-9)


@given(metals, sections, energies, starts)
def test_just_melting_section_just_melts(metal, section, energy, start):
    just = float(heat(metal, section, energy, start).section_to_melt)
    assert float(heat(metal, just, energy, start).melt_margin) == pytest.approx(1.0, rel=1e-9)
    assert heat(metal, just * 1.0001, energy, start).state == "solid"
    assert heat(metal, just * 0.9999, energy, start).state != "solid"


@given(st.sampled_from(["copper", "aluminium", "mild steel"]), sections, energies, starts)
def test_enthalpy_never_falls_and_fraction_means_melting(metal, section, energy, start):
    found = heat(metal, section, energy, start)
    assert 0 <= found.melted_fraction <= 1
    assert (0 < found.melted_fraction < 1) == (found.state == "melting")
    assert found.specific_energy_to_melt < found.specific_energy_to_melt_fully
    more = heat(metal, section, energy * 1.5, start)
    assert ("solid", "melting", "molten").index(more.state) >= ("solid", "melting", "molten").index(
        found.state
    )


@given(sections, energies)
def test_order_of_the_metals(section, energy):
    rises = [
        heat(metal, section, energy).temperature_rise
        for metal in ("copper", "aluminium", "mild steel", "stainless steel")
    ]
    assume(all(value is not None for value in rises))
    assert rises == sorted(rises)


@given(metals, sections, energies, starts)
def test_energy_closes_against_an_independent_integration(metal, section, energy, start):
    """Closure: integrate ρ(T)·j²dt = γ·c·dT as an ODE over the specific action, with scipy."""
    assume(rise(metal, section, energy, start) > 1e-6)
    found = conductor(metal, section).substance
    reference, alpha = found["reference_temperature"].value, found["temperature_coefficient"].value
    c = found["density"].value * found["heat_capacity"].value

    def slope(_, temperature):
        return found["resistivity"].value * (1 + alpha * (temperature - reference)) * energy / section**2 / c

    end = solve_ivp(slope, (0, 1), [start], rtol=1e-9, atol=1e-9, method="DOP853").y[0, -1]
    assert rise(metal, section, energy, start) == pytest.approx(end - start, rel=2e-6)


@given(st.floats(1e-9, 1e-3), sections, log_uniform(1e2, 1e6))
def test_coefficient_towards_zero_is_continuous(alpha, section, energy):
    values = {"w": energy, "rho0": 17.8e-9, "q": section, "C": 3.4342e6}
    flat = adiabatic.RISE_CONSTANT(**values)
    assume(alpha * flat < 1e-3)
    assert adiabatic.RISE(alpha=alpha, **values) == pytest.approx(flat, rel=1e-3)
    assert adiabatic.RISE(alpha=1e-15, **values) == pytest.approx(flat, rel=1e-9)


@given(metals, sections, energies, starts)
def test_units_make_no_difference(metal, section, energy, start):
    a = heat(metal, section, energy, start)
    b = heating(
        Conductor(material=metal, section=f"{section * 1e6!r} mm**2", start=f"{start - 273.15!r} degC"),
        Flash((Stroke(specific_energy=f"{energy / 1e6!r} MJ/ohm"),)),
    )
    assert b.melt_margin == pytest.approx(float(a.melt_margin), rel=1e-9)


@given(st.lists(energies, min_size=1, max_size=5), sections, metals)
def test_array_is_the_loop(many, section, metal):
    together = heating(conductor(metal, section), Flash((Stroke(specific_energy=np.array(many)),)))
    for index, energy in enumerate(many):
        alone = heat(metal, section, energy).temperature_rise
        both = together.temperature_rise[index]
        assert np.isnan(both) if alone is None else both == pytest.approx(float(alone), rel=1e-12)


# -- forces --------------------------------------------------------------------------------------------------


@given(currents, lengths, st.floats(0.2, 5.0))
def test_force_scales_with_current_squared_and_distance(current, distance, k):
    base = magnetics.PARALLEL_PER_LENGTH(i2=current**2, d=distance)
    assert magnetics.PARALLEL_PER_LENGTH(i2=(k * current) ** 2, d=distance) == pytest.approx(
        k**2 * base, rel=1e-12
    )
    assert magnetics.PARALLEL_PER_LENGTH(i2=current**2, d=k * distance) == pytest.approx(base / k, rel=1e-12)


@given(currents, lengths, lengths)
def test_finite_is_below_infinite_and_tends_to_it(current, distance, length):
    infinite = magnetics.PARALLEL_PER_LENGTH(i2=current**2, d=distance) * length
    assert 0 < magnetics.PARALLEL_FINITE(i2=current**2, d=distance, l=length) <= infinite
    long = 1e4 * distance
    ratio = magnetics.PARALLEL_FINITE(i2=1.0, d=distance, l=long) / (
        magnetics.PARALLEL_PER_LENGTH(i2=1.0, d=distance) * long
    )
    assert ratio == pytest.approx(1, abs=2e-4)


@given(currents, lengths, lengths)
def test_finite_force_is_the_slope_of_the_mutual_inductance(current, distance, length):
    """Closure: F = i²·dM/dd with M of two facing segments (Grover)."""
    assume(0.02 < distance / length < 50)

    def mutual(d):
        return 2e-7 * (length * math.asinh(length / d) - math.hypot(length, d) + d)

    step = 1e-4 * distance
    slope = (mutual(distance + step) - mutual(distance - step)) / (2 * step)
    assert magnetics.PARALLEL_FINITE(i2=current**2, d=distance, l=length) == pytest.approx(
        -slope * current**2, rel=1e-4
    )


@given(lengths, log_uniform(1e-3, 1e-2), st.floats(2.0, 100.0))
def test_bend_is_the_integral_of_its_profile(leg, start, factor):
    from scipy.integrate import quad

    end = start * factor
    # over ln x, where the profile is smooth
    whole = quad(
        lambda u: magnetics.BEND_PER_LENGTH(i2=1.0, x=math.exp(u), l=leg) * math.exp(u),
        math.log(start),
        math.log(end),
    )[0]
    assert magnetics.BEND(i2=1.0, x1=start, x2=end, l=leg) == pytest.approx(whole, rel=1e-8)


@given(currents, log_uniform(1e-3, 1e-1), st.floats(0.2, 5.0))
def test_pinch_similarity(current, radius, k):
    base = magnetics.PINCH_SURFACE(i2=current**2, r=radius)
    assert magnetics.PINCH_SURFACE(i2=(k * current) ** 2, r=k * radius) == pytest.approx(base, rel=1e-12)
    assert magnetics.PINCH_AXIS(i2=current**2, r=radius) == pytest.approx(2 * base, rel=1e-12)
    # closure: B²/(2·mu0) with B = mu0·i/(2·pi·r)
    b = 4e-7 * math.pi * current / (2 * math.pi * radius)
    assert base == pytest.approx(b**2 / (2 * 4e-7 * math.pi), rel=1e-12)


@given(st.floats(0.05, 0.5), st.floats(0.05, 0.5), currents, lengths)
def test_force_is_symmetric_in_the_shares(one, two, current, distance):
    flash = Flash((Stroke(peak=current, specific_energy=current**2 * 1e-4),))

    def force(own, other):
        thing = conductor(
            "copper", 1e-8, share=own, neighbour=({"spacing": quantity(distance, "m"), "share": other},)
        )
        return forces(thing, flash.through(own)).force_per_length

    assert force(one, two) == pytest.approx(force(two, one), rel=1e-12)


# -- arc root ------------------------------------------------------------------------------------------------


@given(st.floats(5, 20), log_uniform(1, 300), st.floats(0.1, 10), starts)
def test_melted_volume_is_linear_and_closes(drop, charge, k, start):
    values = {"gamma": 2700.0, "c": 908.0, "L": 397e3, "T_m": 931.15, "T_0": start}
    volume = arcroot.MELTED_VOLUME_BOUND(u=drop, Q=charge, **values)
    assert arcroot.MELTED_VOLUME_BOUND(u=drop, Q=charge * k, **values) == pytest.approx(k * volume, rel=1e-12)
    assert volume * 2700 * (908 * (931.15 - start) + 397e3) == pytest.approx(drop * charge, rel=1e-12)
    assert arcroot.MELTED_VOLUME_BOUND(u=drop, Q=charge, **(values | {"T_0": start + 5})) > volume
