"""Waveforms: what they accept and refuse, arrays, sums, and integrals against an independent quadrature."""

import copy
import pickle
from dataclasses import FrozenInstanceError
from itertools import pairwise

import numpy as np
import pytest
from scipy.integrate import quad

from strikeenergy.errors import InputError, QuantityError, UnknownName
from strikeenergy.lightning.waveform import (
    SHAPES,
    ConcaveFront,
    DoubleExponential,
    Heidler,
    LinearFront,
    PowerExponential,
    Rectangle,
    Sampled,
    Sum,
    Trapezoid,
    Triangle,
    Waveform,
    designation,
    from_shape,
)
from strikeenergy.physics import pulses
from strikeenergy.units import quantity

US = 1e-6
WAVES = {
    "heidler": Heidler(200e3, 19e-6, 485e-6),
    "heidler, real n": Heidler(12e3, 0.3e-6, 74e-6, 1.53),
    "heidler, n = 1": Heidler(12e3, 0.3e-6, 74e-6, 1),
    "heidler, steep": Heidler(20e3, 6e-6, 50e-6, 116),
    "heidler, 8/20": Heidler(20e3, 20.3e-6, 11.6e-6),
    "double exponential": DoubleExponential(200e3, 11354, 647265),
    "power exponential": PowerExponential(20e3, 2.93, 3.976e-6),
    "power exponential, p = 1": PowerExponential(20e3, 1.0, 4e-6),
    "linear front": LinearFront(100e3, 10e-6, 500e-6),
    "trapezoid": Trapezoid(300.0, 1e-3, 0.5, 2e-3),
    "triangle": Triangle(1e3, 2e-6, 5e-6),
    "rectangle": Rectangle(400.0, 0.5),
    "concave front": ConcaveFront(31.1e3, 3.83e-6, 24.3e9, 77.5e-6),
}


def by_quad(f, knots):
    """Sum of scipy's adaptive quadrature over the pieces between points spread over the whole duration."""
    start, end = knots[0], knots[-1]
    points = np.unique(np.concatenate([knots, [start], start + np.geomspace(1e-6, 1, 50) * (end - start)]))
    return sum(quad(f, a, b, epsabs=0, epsrel=1e-11, limit=200)[0] for a, b in pairwise(points))


@pytest.mark.parametrize("name", WAVES)
def test_integrals_against_quadrature(name):
    w = WAVES[name]
    start, end = w.support
    corners = [start, w.peak_time, end]
    corners += [w.front, w.length - w.fall] if isinstance(w, Trapezoid) else []
    corners += [w.steepest_time] if isinstance(w, ConcaveFront) else []
    knots = np.unique(corners)
    assert by_quad(w.current, knots) == pytest.approx(w.charge, rel=1e-9)
    assert by_quad(lambda t: w.current(t) ** 2, knots) == pytest.approx(w.specific_energy, rel=1e-9)
    half = 0.4 * end
    assert by_quad(w.current, np.append(knots[knots < half], half)) == pytest.approx(
        w.charge_until(half), rel=1e-9
    )
    assert w.charge_until(-1.0) == 0
    assert Waveform.charge_until(w, half) == pytest.approx(w.charge_until(half), rel=1e-10)


@pytest.mark.parametrize("name", WAVES)
def test_slope_is_the_derivative(name):
    w = WAVES[name]
    t = w.peak_time * np.array([0.2, 0.7, 1.3]) if w.peak_time else w.support[1] * np.array([0.2, 0.7])
    step = 1e-6 * t
    numeric = (w.current(t + step) - w.current(t - step)) / (2 * step)
    np.testing.assert_allclose(w.slope(t), numeric, rtol=1e-5, atol=1e-4 * w.peak / w.support[1])
    assert w.slope(-1.0) == 0
    fine = np.linspace(0, max(w.peak_time, 1e-9), 20001)[1:-1]
    assert w.slope(fine).max() <= w.max_steepness * (1 + 1e-9)
    if np.isfinite(w.max_steepness):
        assert w.slope(w.steepest_time) == pytest.approx(w.max_steepness)


@pytest.mark.parametrize("name", WAVES)
def test_front_and_half_value_time_by_their_definition(name):
    w = WAVES[name]
    dense = np.unique(np.concatenate([np.linspace(0, w.peak_time, 20001), [w.support[1]]]))
    early = dense[dense <= w.peak_time]
    cross = [float(np.interp(level * w.peak, w.current(early), early)) for level in (0.1, 0.3, 0.9)]
    assert w.front_time() == pytest.approx(1.25 * (cross[2] - cross[0]), rel=1e-3)
    assert w.front_time("30/90") == pytest.approx((cross[2] - cross[1]) / 0.6, rel=1e-3)
    assert w.virtual_origin() == pytest.approx(cross[0] - 0.1 * w.front_time(), abs=2e-3 * w.front_time())
    after = w.virtual_origin() + w.half_value_time()
    assert w.current(after * (1 - 1e-9)) > w.peak / 2 * (1 - 1e-6)
    assert w.current(after * (1 + 1e-9)) < w.peak / 2 * (1 + 1e-6)


def test_arrays_are_the_loop():
    peak, tau1, n = np.array([1e4, 2e5]), np.array([[1e-6], [19e-6], [3e-6]]), 10
    many = Heidler(peak, tau1, 4e-4, n)
    assert many.shape == (3, 2)
    for name in (
        "peak",
        "charge",
        "specific_energy",
        "peak_time",
        "max_steepness",
        "duration",
        "absolute_charge",
    ):
        values = getattr(many, name)
        assert np.shape(values) == (3, 2)
        for j in range(3):
            for k in range(2):
                one = Heidler(peak[k], tau1[j, 0], 4e-4, n)
                assert values[j, k] == pytest.approx(getattr(one, name), rel=1e-13)
                assert getattr(many[j, k], name) == pytest.approx(getattr(one, name), rel=1e-13)
    np.testing.assert_allclose(many.front_time()[1, 0], Heidler(1e4, 19e-6, 4e-4).front_time(), rtol=1e-12)
    t = np.linspace(0, 1e-3, 7)
    assert many.current(t[:, None, None]).shape == (7, 3, 2)
    assert many.charge_until(t[:, None, None]).shape == (7, 3, 2)
    assert many[1].shape == (2,)


@pytest.mark.parametrize("name", SHAPES)
def test_every_shape_takes_arrays_and_text(name):
    single = WAVES[name]
    texts = {
        key: f"{value!r} {single.UNITS[key]}" if single.UNITS[key] != "1" else value
        for key, value in single.parameters.items()
    }
    assert from_shape(name, **texts) == single
    quantities = {
        key: quantity(value, single.UNITS[key]) if single.UNITS[key] != "1/s" else value
        for key, value in single.parameters.items()
    }
    assert type(single)(**quantities) == single
    parameters = {key: np.array([value, value * 1.25]) for key, value in single.parameters.items()}
    many = type(single)(**parameters)
    last = type(single)(**{key: value[1] for key, value in parameters.items()})
    for found in ("peak", "charge", "specific_energy", "peak_time", "max_steepness"):
        np.testing.assert_allclose(
            getattr(many, found), [getattr(single, found), getattr(last, found)], rtol=1e-12
        )
    np.testing.assert_allclose(
        many.half_value_time(), [single.half_value_time(), last.half_value_time()], rtol=1e-12
    )
    both = many + many.delayed(1e-6)
    np.testing.assert_allclose(
        both.specific_energy[1], (last + last.delayed(1e-6)).specific_energy, rtol=1e-12
    )
    np.testing.assert_allclose(both.front_time()[1], (last + last.delayed(1e-6)).front_time(), rtol=1e-9)


def test_large_arrays_of_sums_go_through_in_pieces():
    peak = np.linspace(1e4, 2e5, 2500)
    w = Heidler(peak, 1.8e-6, 285e-6) + Rectangle(400.0, 0.01)
    for k in (0, 999, 1000, 2499):
        one = w[k]
        assert w.peak[k] == pytest.approx(one.peak, rel=1e-13)
        assert w.front_time()[k] == pytest.approx(one.front_time(), rel=1e-9)


def test_text_and_frozen_and_equal():
    w = Heidler("200 kA", "19 us", "485 us")
    assert w == Heidler(200e3, 19e-6, 485e-6)
    assert w != Heidler(200e3, 19e-6, 485e-6, 9)
    assert w != Rectangle(400.0, 0.5)
    assert hash(w) == hash(Heidler(200e3, 19e-6, 485e-6))
    assert eval(repr(w)) == w
    assert pickle.loads(pickle.dumps(w)) == w == copy.deepcopy(w)
    with pytest.raises(FrozenInstanceError):
        w.tau1 = 1.0
    array = np.array([1e3, 2e3])
    kept = Heidler(array, 1e-6, 5e-5)
    array[0] = 7
    assert kept.peak[0] == 1e3


def test_standard_normalisation():
    printed = Heidler(200e3, 19e-6, 485e-6, normalise="standard", k=0.93)
    assert (printed.nominal, printed.k) == (200e3, 0.93)
    assert printed.current(printed.peak_time) == printed.peak != 200e3
    assert Heidler(**printed.parameters, normalise="standard") == printed
    exact = Heidler(200e3, 19e-6, 485e-6)
    assert exact.current(exact.peak_time) == pytest.approx(200e3, rel=1e-14)
    assert "k" not in exact.parameters


@pytest.mark.parametrize(
    ("make", "words"),
    [
        (lambda: Heidler(-1, "3 us", [1, np.nan], 0.5), ["peak: -1", "tau2: nan", "1 of 2", "n: below 1"]),
        (lambda: Heidler(np.inf, 0, "x"), ["peak: inf", "tau1: 0 is not above zero", "tau2: 'x'"]),
        (lambda: Heidler("200 kA", "19 kA", True), ["tau1", "a current", "tau2: True"]),
        (lambda: Heidler(None, 1e-6, object()), ["peak: it is missing", "tau2: object found"]),
        (lambda: Heidler(1e3, 1e-3, 1e-6), ["n·tau2", "power exponential"]),
        (lambda: Heidler(1e3, 1e-6, 1e-4, k=0.9), ["k:", "exact", "leave it out"]),
        (lambda: Heidler(1e3, 1e-6, 1e-4, normalise="none"), ["'none'", "write 'exact' or 'standard'"]),
        (lambda: Heidler([1, 2], [1, 2, 3], 1), ["do not fit together", "peak (2,)", "tau1 (3,)"]),
        (lambda: DoubleExponential(1e3, 6e5, 1e4), ["beta", "exchange"]),
        (lambda: DoubleExponential(1e3, 1e4, 1e4), ["beta", "exchange"]),
        (lambda: PowerExponential(1e3, 0.5, 1e-6), ["p:", "Heidler"]),
        (lambda: Triangle(1e3, 6e-6, 5e-6), ["duration", "the rise is longer"]),
        (lambda: Trapezoid(1e3, 6e-6, 5e-6, 0), ["longer than the duration"]),
        (lambda: Rectangle(0, -1), ["current: 0", "duration: -1"]),
        (lambda: LinearFront(1, -1, 1), ["front: -1 is below zero"]),
        (lambda: ConcaveFront(31e3, 4e-6, 7e9, 77e-6), ["mean", "linear front"]),
        (lambda: ConcaveFront(31e3, 4e-6, 24e9, 6.6e-6), ["half value"]),
        (lambda: Sampled([0, 1, 1, 2], [0, 1, 2, 3]), ["sample 2"]),
        (lambda: Sampled([0, 1, np.nan], [0, 1]), ["t: nan"]),
        (lambda: Sampled([0, 1, 2], [0, 1]), ["3 times but 2 currents"]),
        (lambda: Sampled([0], [0]), ["two samples"]),
        (lambda: Sum([]), ["0 parts"]),
        (lambda: Heidler([1, 2], 1e-6, 1e-4) + Heidler([1, 2, 3], 1e-6, 1e-4), ["broadcast"]),
        (lambda: WAVES["heidler"].delayed(np.nan), ["nan"]),
        (lambda: WAVES["heidler"].front_time("20/80"), ["20/80", "10/90"]),
        (lambda: designation("8-20", 1e3), ["'8-20'", "10/350"]),
        (lambda: designation("0/20", 1e3), ["'0/20'"]),
        (lambda: designation("8/9", 1e3), ["1.125", "Trapezoid"]),
        (lambda: from_shape("heidlr"), ["heidlr", "heidler"]),
        (
            lambda: from_shape("heidler", peek=1),
            ["peek", "'peak'", "tau1: it is missing", "tau2: it is missing"],
        ),
        (lambda: from_shape("10/350"), ["peak: it is missing"]),
        (lambda: from_shape("10/350", peak="3 m"), ["peak"]),
    ],
)
def test_refusals_name_everything_at_once(make, words):
    with pytest.raises(InputError) as caught:
        make()
    for word in words:
        assert word in str(caught.value)


@pytest.mark.parametrize(
    ("family", "times", "use"),
    [
        (DoubleExponential, (8e-6, 20e-6), "PowerExponential"),
        (DoubleExponential, (1.0, 3.804), "PowerExponential"),
        (PowerExponential, (10e-6, 350e-6), "Heidler"),
        (lambda *a: Heidler.from_times(*a, n=2), (8e-6, 20e-6), "n = 3"),
        (DoubleExponential, (-1, np.nan), "half_value_time"),
    ],
)
def test_shapes_out_of_reach_say_what_to_use(family, times, use):
    with pytest.raises(InputError, match=use):
        getattr(family, "from_times", family)(1e3, *times)


def test_double_exponential_just_within_reach():
    w = DoubleExponential.from_times(1e3, 1.0, 3.8048)
    assert w.half_value_time() / w.front_time() == pytest.approx(3.8048, rel=1e-9)


@pytest.mark.parametrize(
    ("text", "family"),
    [
        ("10/350", Heidler),
        ("1/200", Heidler),
        ("0.25/100", Heidler),
        ("10/1000", Heidler),
        ("1/20", Heidler),
        ("8/20", PowerExponential),
        ("4/10 µs", PowerExponential),
        (" 30 / 80 us", PowerExponential),
    ],
)
def test_designations(text, family):
    w = designation(text, "100 kA")
    t1, t2 = (float(part) for part in text.strip(" usµ").split("/"))
    assert isinstance(w, family)
    assert w.peak == 100e3
    assert w.front_time() == pytest.approx(t1 * US, rel=1e-12)
    assert w.half_value_time() == pytest.approx(t2 * US, rel=1e-12)
    voltage = designation("1.2/50", [1.0, 2.0], "30/90")
    np.testing.assert_allclose(voltage.front_time("30/90"), 1.2e-6, rtol=1e-12)


def test_shapes_by_name():
    assert from_shape("rectangle", current="400 A", duration="0.5 s") == Rectangle(400, 0.5)
    assert from_shape("heidler", peak=1.0, tau1=1e-6, tau2=1e-4, normalise="standard").normalise == "standard"
    assert from_shape("10/350", peak="200 kA") == designation("10/350", 200e3)
    with pytest.raises(UnknownName):
        from_shape("wiggle")
    for shape in SHAPES.values():
        assert set(shape.OPTIONAL) <= set(shape.UNITS)


def test_sums():
    a, b = Heidler(30e3, 1.8e-6, 95e-6), DoubleExponential(10e3, 2e4, 2e6)
    assert (a + b).parts == (a, b)
    assert sum([a, b, a]) == a + b + a
    assert (a + b).delayed("30 ms").offsets == (0.03, 0.03)
    assert (2 * a).factors == (np.float64(2.0) * a).factors == (2.0,)
    assert (a + b) * 2 - b == Sum([a, b, b], factors=[2, 2, -1])
    assert (a + b) != (b + a)
    assert hash(a + b) == hash(a + b)
    assert (a + b)[()] == a + b
    w = (a + b.delayed(5e-6)) * 0.5
    t = np.linspace(0, 1e-4, 11)
    np.testing.assert_allclose(w.current(t), 0.5 * (a.current(t) + b.current(t - 5e-6)))
    np.testing.assert_allclose(w.slope(t), 0.5 * (a.slope(t) + b.slope(t - 5e-6)))
    np.testing.assert_allclose(w.charge_until(t), 0.5 * (a.charge_until(t) + b.charge_until(t - 5e-6)))
    with pytest.raises(TypeError):
        a + 1
    with pytest.raises(TypeError):
        a - 1


@pytest.mark.parametrize("first", WAVES)
@pytest.mark.parametrize(
    "second", ["heidler", "double exponential", "triangle", "rectangle", "power exponential"]
)
@pytest.mark.parametrize("delay", [7e-6, -3e-6])
def test_products_of_overlapping_parts(first, second, delay):
    a, b = WAVES[first], WAVES[second]
    total = a + b.delayed(delay)
    product = (total.specific_energy - a.specific_energy - b.specific_energy) / 2
    whole = total.specific_energy_until(total.support[1])
    assert total.specific_energy == pytest.approx(whole, rel=1e-10)
    ends = [max(0.0, delay), min(a.support[1], b.support[1] + delay)]
    corners = [w.peak_time + o for w, o in ((a, 0), (b, delay))]
    corners += [o + w.length - w.fall for w, o in ((a, 0), (b, delay)) if isinstance(w, Trapezoid)]
    knots = np.unique([ends[0], *(c for c in corners if ends[0] < c < ends[1]), ends[1]])
    independent = by_quad(lambda t: a.current(t) * b.current(t - delay), knots)
    assert product == pytest.approx(independent, rel=1e-6, abs=1e-9 * whole)


def test_reversing_current():
    w = Heidler(30e3, 1e-6, 50e-6)
    both = w - w.delayed(20e-6)
    t = np.linspace(0, 3e-3, 400_001)
    assert both.charge == pytest.approx(0, abs=1e-12)
    assert both.absolute_charge == pytest.approx(np.abs(both.current(t)).sum() * t[1], rel=1e-6)
    assert both.absolute_charge > abs(both.charge)
    assert both.mean_absolute(1e-4) == pytest.approx(both.absolute_charge_until(1e-4) / 1e-4)
    assert (w * -1).peak == -30e3
    assert (w * -1).max_steepness == pytest.approx(w.max_steepness)


def test_steps_within_a_sum():
    impulse, long_stroke = WAVES["heidler"], WAVES["rectangle"]
    assert np.isinf(long_stroke.max_steepness)
    assert (impulse + long_stroke).max_steepness == pytest.approx(impulse.max_steepness, rel=1e-9)
    assert np.isinf((long_stroke + LinearFront(1e3, 0, 1e-4)).max_steepness)
    assert (impulse + long_stroke).peak == pytest.approx(200.4e3, rel=1e-12)
    assert long_stroke.front_time() == 0
    assert long_stroke.half_value_time() == 0.5
    assert (long_stroke + Rectangle(100.0, 0.2)).half_value_time() == pytest.approx(
        0.5
    )  # falls to 400 A, then at once to 0
    assert (long_stroke + Rectangle(500.0, 0.2)).half_value_time() == pytest.approx(0.2)


def test_sampled():
    t, i = np.array([0, 1, 2, 4, 5.0]), np.array([0, 2, -1, 3, 0.0])
    w = Sampled(t, i)
    assert w.charge == pytest.approx(1 + 0.5 + 2 + 1.5)
    assert w.charge_until(0.5) == pytest.approx(0.25)
    assert w.charge_until(9.0) == w.charge
    assert w.specific_energy == pytest.approx(4 / 3 + 1 + 2 * 7 / 3 + 3)
    assert w.absolute_charge == pytest.approx(1 + 5 / 6 + 2 * 10 / 8 + 1.5)
    assert (w.peak, w.peak_time, w.max_steepness) == (3, 4, 2)
    assert w.shape == ()
    assert "5 samples" in repr(w)
    dense = np.linspace(0, 3e-3, 3001)
    record = Sampled(dense, WAVES["heidler"].current(dense))
    assert record.specific_energy == pytest.approx(WAVES["heidler"].specific_energy, rel=2e-3)
    joined = record + Rectangle(400.0, 0.5)
    window = record.charge_until(0.5)
    assert joined.specific_energy == pytest.approx(record.specific_energy + 80e3 + 800 * window, rel=1e-12)
    assert (record + record).specific_energy == pytest.approx(4 * record.specific_energy, rel=1e-12)


def test_record_of_a_known_wave():
    w = WAVES["concave front"]
    t = np.linspace(-10e-6, 600e-6, 200_001)
    record = Sampled(t, -w.current(t))
    assert record.peak == pytest.approx(-w.peak, rel=1e-6)
    assert record.front_time() == pytest.approx(w.front_time(), rel=1e-4)
    assert record.half_value_time() == pytest.approx(w.half_value_time(), rel=1e-4)
    assert record.max_steepness == pytest.approx(w.max_steepness, rel=3e-3)
    assert record.charge == pytest.approx(-w.charge_until(600e-6), rel=1e-6)


def test_find_root_and_maximise():
    np.testing.assert_allclose(
        pulses.find_root(lambda x: x**3 - np.array([8.0, 27.0]), 0.0, 10.0), [2, 3], rtol=1e-15
    )
    assert pulses.find_root(lambda x: np.exp(x) - 1e-300, -1000.0, 10.0) == pytest.approx(np.log(1e-300))
    assert pulses.find_root(lambda x: np.where(x < 3, -1.0, 1.0), 0.0, 10.0) == pytest.approx(3)
    assert pulses.maximise(lambda x: -((x - 2) ** 2), 0.0, 5.0) == pytest.approx(2, abs=1e-7)


def test_integrals_of_no_sets():
    first, second = pulses.heidler_integrals(np.empty(0), 10.0)
    assert first.shape == second.shape == (0,)


def test_quantity_errors_are_input_errors():
    assert issubclass(QuantityError, InputError)
    charge = pulses.heidler_charge(200e3, 19e-6, 485e-6, 10.0, 0.93)
    energy = pulses.heidler_specific_energy(200e3, 19e-6, 485e-6, 10.0, 0.93)
    w = Heidler(200e3, 19e-6, 485e-6, normalise="standard", k=0.93)
    assert (charge, energy) == pytest.approx((w.charge, w.specific_energy), rel=1e-14)
