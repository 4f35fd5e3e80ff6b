"""Magnetic forces and the motion they cause, for any lengths and currents: similarity laws, each with an anchor.

Scaling with i² and 1/d, symmetry, attraction, finite against infinite length, impulse and specific energy, the bounds
of a displacement, the pinch of tubes, and nothing on nothing.
"""

import numpy as np
import pytest
from hypothesis import assume, example, given
from hypothesis import strategies as st

from strikeenergy.physics import biot_savart as bs
from strikeenergy.physics import loops, magnetics, motion, oscillator


def log_uniform(low, high):
    return st.floats(np.log10(low), np.log10(high)).map(lambda x: float(10**x))


LENGTHS = log_uniform(0.05, 20)
CURRENTS = log_uniform(1e2, 3e5)
SIGNED = st.tuples(CURRENTS, st.sampled_from([-1, 1])).map(lambda x: x[0] * x[1])
POINTS = st.tuples(*[st.floats(-1, 1)] * 3)


def facing(length, distance, one=1.0, two=1.0):
    return bs.beside(
        bs.chain([[0, 0, 0], [length, 0, 0]], one),
        bs.chain([[0, distance, 0], [length, distance, 0]], two),
    )


# -- pairs of conductors -----------------------------------------------------------------------------------


@given(length=LENGTHS, distance=LENGTHS, one=SIGNED, two=SIGNED)
@example(length=1.0, distance=0.1, one=100e3, two=100e3)
def test_facing_pair_is_the_closed_form(length, distance, one, two):
    force = bs.forces(facing(length, distance, one, two), 0.01 * distance).force
    closed = magnetics.PARALLEL_FINITE(i2=one * two, d=distance, l=length)
    # the other wire's force, without the wire's own, which has no component across it
    assert force[0, 1] == pytest.approx(closed, rel=1e-8)
    np.testing.assert_allclose(force[0], -force[1], rtol=1e-9, atol=1e-9 * abs(closed))
    assert np.sign(force[0, 1]) == np.sign(one * two)  # like currents attract


@given(length=LENGTHS, distance=LENGTHS, k=log_uniform(0.01, 100))
def test_scaling(length, distance, k):
    force = bs.forces(facing(length, distance), 0.01 * distance, 1.0).force[0, 1]
    assert bs.forces(facing(length, distance), 0.01 * distance, k**2).force[0, 1] == pytest.approx(
        k**2 * force, rel=1e-12
    )
    # the same figure at any size
    assert bs.forces(facing(k * length, k * distance), 0.01 * k * distance).force[0, 1] == pytest.approx(
        force, rel=1e-9
    )


@given(length=LENGTHS, distance=LENGTHS)
def test_finite_is_less_than_infinite(length, distance):
    infinite = length * magnetics.PARALLEL_PER_LENGTH(i2=1.0, d=distance)
    finite = bs.forces(facing(length, distance), 0.01 * distance).force[0, 1]
    assert finite < infinite
    assert finite == pytest.approx(infinite, rel=1.01 * distance / length)


@given(length=LENGTHS, distance=LENGTHS, tau=log_uniform(1e-5, 1e-3), peak=CURRENTS)
def test_impulse_is_that_of_the_specific_energy(length, distance, tau, peak):
    # W/R of an exponential is I²·τ/2; the samples reach down to e^−24
    t = np.linspace(0, 24, 4001) * tau
    force = oscillator.pulse_of_current(t, peak * np.exp(-t / tau), 2e-7 * length / distance)
    exact = length * magnetics.PARALLEL_PER_LENGTH(i2=peak**2 * tau / 2, d=distance)
    assert oscillator.impulse(force) == pytest.approx(exact, rel=2e-5)
    closed = oscillator.exponentials_of_current([peak], [tau], 2e-7 * length / distance)
    assert oscillator.impulse(closed) == pytest.approx(exact, rel=1e-12)


@given(length=log_uniform(1e-9, 1e-6), distance=LENGTHS)
def test_nothing_on_nothing(length, distance):
    assert magnetics.PARALLEL_FINITE(i2=1e10, d=distance, l=0.0) == 0
    assert (
        abs(bs.forces(facing(length, distance), 0.01 * distance, 1e10).force[0, 1]) < 1e4 * length / distance
    )


@given(n=st.integers(2, 12), radius=LENGTHS, current=CURRENTS)
def test_sharing(n, radius, current):
    angle = np.arange(n) * 2 * np.pi / n
    around = radius * np.stack([np.cos(angle), np.sin(angle)], axis=1)
    pulls = loops.parallel_group(around, np.full(n, 1 / n), current**2)
    inward = loops.RING_OF_N(i2=current**2, n=n, R=radius)
    np.testing.assert_allclose(pulls, -around / radius * inward, rtol=1e-9, atol=1e-9 * inward)
    # one pair among them pulls by 1/n² of what it would with the whole current
    assert magnetics.PARALLEL_PER_LENGTH(i2=loops.SHARED(i2=current**2, n=n), d=radius) == pytest.approx(
        magnetics.PARALLEL_PER_LENGTH(i2=current**2, d=radius) / n**2, rel=1e-12
    )


# -- any geometry ------------------------------------------------------------------------------------------


@given(points=st.lists(POINTS, min_size=3, max_size=6), shift=POINTS)
def test_a_closed_wire_does_not_push_itself(points, shift):
    p = np.array(points)
    assume(np.linalg.norm(p - np.roll(p, 1, axis=0), axis=1).min() > 0.3)
    path = bs.chain(p, closed=True)
    apart = bs.distances(path)
    n = len(p)
    far = [apart[i, j] for i in range(n) for j in range(i) if j not in ((i + 1) % n, (i - 1) % n)]
    assume(not far or min(far) > 0.2)
    # and no corner so sharp that legs lie along each other
    d = path.end - path.start
    unit = d / np.linalg.norm(d, axis=1)[:, None]
    assume(np.einsum("ij,ij->i", unit, np.roll(unit, -1, axis=0)).min() > -0.9)
    loads = bs.forces(path, 0.02, about=shift)
    size = np.abs(loads.force).max()
    assert np.abs(loads.force.sum(axis=0)).max() < 1e-6 * size
    assert np.abs(loads.moment.sum(axis=0)).max() < 1e-6 * size * (1 + np.abs(loads.moment).max() / size)


@given(points=st.lists(POINTS, min_size=3, max_size=5), angle=st.floats(0, 6.3), shift=POINTS, share=SIGNED)
def test_turned_and_moved(points, angle, shift, share):
    p = np.array(points)
    assume(np.linalg.norm(np.diff(p, axis=0), axis=1).min() > 0.2)
    c, s = np.cos(angle), np.sin(angle)
    turn = np.array([[c, -s, 0], [s, c, 0], [0, 0, 1]])
    at = np.array([2.0, -1.5, 1.7])
    here = bs.field(at, bs.chain(p, share))
    there = bs.field(turn @ at + shift, bs.chain(p @ turn.T + shift, share))
    np.testing.assert_allclose(
        there, turn @ here, rtol=1e-8, atol=1e-10 * np.linalg.norm(here) + 1e-13 * abs(share) * 1e-7
    )
    assert bs.field(at, bs.chain(p, 2 * share)) == pytest.approx(2 * here, rel=1e-12)


# -- motion ------------------------------------------------------------------------------------------------


@given(frequency=log_uniform(1, 1e5), tail=log_uniform(1e-5, 1e-3), front=st.floats(0.001, 0.5))
def test_displacement_is_bounded_by_peak_and_by_impulse(frequency, tail, front):
    load = oscillator.exponentials_of_current([1.0, -1.0], [tail, tail * front])
    peak = oscillator.extent(load).peak
    factor = oscillator.dynamic_load_factor(load, frequency)
    assert factor <= 2
    rule = motion.SHORT_PULSE_FACTOR(omega=2 * np.pi * frequency, T_W=oscillator.impulse(load) / peak)
    assert factor <= rule * (1 + 1e-4)
    if rule < 0.01:
        assert factor == pytest.approx(rule, rel=1e-3)


@given(
    ends=st.sampled_from(motion.ENDS),
    diameter=log_uniform(4e-3, 30e-3),
    length=log_uniform(0.3, 3),
    k=log_uniform(0.1, 10),
)
def test_similar_spans_are_stressed_alike(ends, diameter, length, k):
    # lengths, times and currents all times k: the same stress, since σ = M/Z with w ~ i²/d, EI ~ d⁴, m ~ d²
    def stress(scale):
        d = scale * diameter
        load = oscillator.exponentials_of_current([scale * 1e5], [scale * 5e-4], 2e-7 / (10 * d))
        span = motion.span_response(
            load,
            ends,
            scale * length,
            2e11 * np.pi * d**4 / 64,
            7850 * np.pi * d**2 / 4,
            number=5,
            xi=[0.0, 0.5],
        )
        return span.moment / (np.pi * d**3 / 32)

    assert stress(k) == pytest.approx(stress(1.0), rel=1e-6, abs=1.0)


# -- tubes -------------------------------------------------------------------------------------------------


@given(radius=log_uniform(1e-3, 0.1), wall=st.floats(0.02, 0.9), current=CURRENTS, k=log_uniform(0.1, 10))
def test_tubes(radius, wall, current, k):
    inner = radius * (1 - wall)
    hoop = loops.TUBE_HOOP_THICK(i2=current**2, a=inner, b=radius)
    # lengths times k and the current times k: the same stress
    same = loops.TUBE_HOOP_THICK(i2=(k * current) ** 2, a=k * inner, b=k * radius)
    assert same == pytest.approx(hoop, rel=1e-9)
    # a thin wall carries the pinch at its surface, and the yield current is the inverse
    thin = loops.TUBE_HOOP_THIN(i2=current**2, b=radius, t=wall * radius)
    assert thin * wall == pytest.approx(
        magnetics.PINCH_SURFACE(i2=current**2, r=radius) * (1 - wall / 2), rel=1e-9
    )
    if wall < 0.1:
        assert hoop == pytest.approx(thin, rel=1.5 * wall)
    back = loops.TUBE_YIELD_CURRENT_THICK(sigma_y=hoop, a=inner, b=radius)
    assert back == pytest.approx(current, rel=1e-9)
    back = loops.TUBE_YIELD_CURRENT_THIN(sigma_y=thin, b=radius, t=wall * radius)
    assert back == pytest.approx(current, rel=1e-9)


@given(n=st.floats(1, 50), radius=log_uniform(0.01, 2), ratio=log_uniform(0.02, 100))
def test_coil_forces_are_gradients(n, radius, ratio):
    length, h = ratio * radius, 1e-4
    axial, hoop = loops.coil_forces(n, radius, length, 1.0)
    by_length = [loops.coil_inductance(n, radius, length * (1 + s * h)) for s in (-1, 1)]
    by_radius = [loops.coil_inductance(n, radius * (1 + s * h), length) for s in (-1, 1)]
    assert axial == pytest.approx((by_length[1] - by_length[0]) / (4 * h * length), rel=3e-6)
    assert hoop == pytest.approx((by_radius[1] - by_radius[0]) / (8 * np.pi * n * h * radius), rel=3e-6)
    assert axial < 0 < hoop
    assert 0 < loops.nagaoka(2 / ratio) < 1
