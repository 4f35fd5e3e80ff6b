"""Waveforms of the published constants against figures worked out from them by closed form and by quadrature.

Constants, each recalled from the publication named (from memory): IEC 62305-1:2010 Annex B (Heidler functions); Nucci,
Diendorfer, Uman, Rachidi, Ianoz and Mazzetti, J. Geophys. Res. 95 (1990) (two-term subsequent stroke); De Conti and
Visacro, IEEE Trans. EMC 49 (2007); Gamerota et al., IEEE Trans. EMC 54 (2012) (sums); IEEE C62.41.2 (1.2/50, 10/1000,
8/20); CIGRE TB 63 (1991) (concave front); SAE ARP5412 / EUROCAE ED-84 (aircraft components). The figures beside them are
not printed there: they were computed from the constants, twice and independently of this program.
"""

import numpy as np
import pytest

from strikeenergy.lightning.waveform import (
    ConcaveFront,
    DoubleExponential,
    Heidler,
    LinearFront,
    PowerExponential,
    Rectangle,
    Trapezoid,
    Triangle,
    designation,
)
from strikeenergy.physics import cigre, pulses

US = 1e-6

# peak, k, tau1, tau2 (µs), then: exact k, customary k, true peak/I, peak time, T1 10/90, T1 30/90, T2, width at half peak,
# virtual origin (µs), Q (C), W/R (kJ/ohm), max di/dt (kA/µs), its time (µs), W/R/(I·Q), Q and W/R with the exact k
ANNEX_B = {
    "first positive": (
        (200e3, 0.93, 19.0, 485),
        (0.93118190, 0.9340844, 1.001271, 31.42780, 9.98017, 9.66654, 356.5706, 351.8779, 14.18660),
        (100.231410, 10275.3266, 27.3144, 18.59378, 0.51193, 100.10419, 10249.2593),
    ),
    "first negative": (
        (100e3, 0.986, 1.82, 285),
        (0.98638383, 0.9867623, 1.000389, 3.55186, 0.99357, 0.97363, 200.0940, 199.6369, 1.36024),
        (28.717638, 1444.9712, 139.6786, 1.78339, 0.50297, 28.70646, 1443.8468),
    ),
    "subsequent": (
        (50e3, 0.993, 0.454, 143),
        (0.99276316, 0.9929204, 0.999761, 0.94418, 0.24933, 0.24476, 99.8194, 99.7050, 0.33932),
        (7.177201, 179.9965, 279.0346, 0.44492, 0.50170, 7.17891, 180.0824),
    ),
}


def digits(value, printed, last):
    """Agree to one unit of the last digit."""
    assert value == pytest.approx(printed, abs=0.55 * 10.0**-last, rel=0), (value, printed)


@pytest.mark.parametrize("name", ANNEX_B)
def test_annex_b(name):
    (peak, k, tau1, tau2), shape, integrals = ANNEX_B[name]
    exact = Heidler(peak, tau1 * US, tau2 * US)
    printed = Heidler(peak, tau1 * US, tau2 * US, normalise="standard", k=k)
    digits(exact.k, shape[0], 8)
    digits(Heidler(peak, tau1 * US, tau2 * US, normalise="standard").k, shape[1], 7)
    digits(printed.peak / peak, shape[2], 6)
    digits(printed.peak_time / US, shape[3], 5)
    digits(printed.front_time() / US, shape[4], 5)
    digits(printed.front_time("30/90") / US, shape[5], 5)
    digits(printed.half_value_time() / US, shape[6], 4)
    digits(printed.half_value_time("50/50") / US, shape[7], 4)
    digits(printed.virtual_origin() / US, shape[8], 5)
    digits(printed.charge, integrals[0], 6)
    digits(printed.specific_energy / 1e3, integrals[1], 4)
    digits(printed.max_steepness / 1e9, integrals[2], 4)
    digits(printed.steepest_time / US, integrals[3], 5)
    digits(printed.specific_energy / printed.peak / printed.charge, integrals[4], 5)
    assert exact.peak == peak
    digits(exact.charge, integrals[5], 5)
    digits(exact.specific_energy / 1e3, integrals[6], 4)


def test_annex_b_levels():
    levels = Heidler(np.array([200e3, 150e3, 100e3]), 19e-6, 485e-6, normalise="standard", k=0.93)
    np.testing.assert_allclose(levels.charge, [100.231410, 75.173557, 50.115705], atol=6e-7)
    np.testing.assert_allclose(levels.specific_energy / 1e3, [10275.3266, 5779.8712, 2568.8316], atol=6e-5)
    np.testing.assert_allclose(levels.max_steepness / 1e9, [27.3144, 20.4858, 13.6572], atol=6e-5)


@pytest.mark.parametrize(
    ("t1", "t2", "n", "tau1", "tau2", "k", "q", "w"),
    [
        (10, 350, 10, 19.053038, 475.540268, 0.9298122, 491.03712, 251.47410),
        (10, 350, 5, 9.627135, 470.714406, 0.9405241, 489.67610, 252.50684),
        (1, 200, 10, 1.831928, 284.843989, 0.9862965, 286.91966, 144.31656),
        (0.25, 100, 10, 0.455231, 143.258002, 0.9927572, 143.83775, 72.16330),
        (8, 20, 3, 11.800015, 8.422119, 0.1233307, 18.31212, 12.12385),
        (8, 20, 10, 20.329267, 11.604685, 0.1069443, 19.21914, 11.83113),
        (4, 10, 3, 5.900008, 4.211060, 0.1233307, 9.15606, 6.06193),
        (30, 80, 3, 40.232313, 38.326053, 0.1804187, 75.71351, 49.33622),
        (10, 1000, 10, 18.505674, 1408.969247, 0.9739390, 1427.48659, 721.19867),
        (2.6, 50, 5, 2.618446, 64.064853, 0.8966311, 68.40621, 35.90130),
    ],
)
def test_heidler_of_standard_shapes(t1, t2, n, tau1, tau2, k, q, w):
    wave = Heidler.from_times(1.0, t1 * US, t2 * US, n)
    assert wave.front_time() == pytest.approx(t1 * US, rel=1e-12)
    assert wave.half_value_time() == pytest.approx(t2 * US, rel=1e-12)
    digits(wave.tau1 / US, tau1, 6)
    digits(wave.tau2 / US, tau2, 6)
    digits(wave.k, k, 7)
    digits(wave.charge / US, q, 5)
    digits(wave.specific_energy / US, w, 5)


# terms (kA, n, tau1, tau2 in µs), then peak (kA), T1 (µs), max di/dt (kA/µs), Q (C), W/R (J/ohm) with relative tolerance
SUMS = {
    "Nucci 1990": (
        [(10.7, 2, 0.25, 2.5), (6.5, 2, 2.1, 230)],
        (12.0106, 0.4470, 40.076, 1.723932, 6607.448, 1e-7),
    ),
    "De Conti and Visacro 2007": (
        [
            (6, 2, 3, 76),
            (5, 3, 3.5, 10),
            (5, 5, 4.8, 30),
            (8, 9, 6, 26),
            (16.5, 30, 7, 23.2),
            (17, 2, 70, 200),
            (12, 14, 12, 26),
        ],
        (45.2865, 11.152, 20.208, 6.96904, 1.1782e5, 5e-5),
    ),
    "Gamerota 2012, first negative": (
        [(3, 2, 4, 20), (3, 3, 4, 20), (3, 9, 4, 20), (3, 11, 4, 20), (20, 85, 4.5, 23), (15, 2, 20, 240)],
        (32.4052, 2.315, 99.06, 5.58185, 7.1449e4, 1e-5),
    ),
    "Gamerota 2012, subsequent": (
        [(7.5, 55, 1.1, 15), (5, 2, 1.2, 500)],
        (11.2634, 0.727, 96.83, 2.78290, 8643.5, 1e-5),
    ),
    "Gamerota 2012, first positive": (
        [(20, 116, 6, 50), (5, 3, 9, 30), (6, 2.5, 8, 30), (7, 4, 6, 30)],
        (34.8248, 3.793, 99.89, 1.72367, 3.4192e4, 1e-5),
    ),
}


def heidler_sum(terms):
    return sum(Heidler(i * 1e3, a * US, b * US, n, normalise="standard") for i, n, a, b in terms)


@pytest.mark.parametrize("name", SUMS)
def test_sums_of_heidler_functions(name):
    terms, (peak, front, steepness, charge, energy, tolerance) = SUMS[name]
    wave = heidler_sum(terms)
    digits(wave.peak / 1e3, peak, 4)
    digits(wave.front_time() / US, front, 3)
    assert wave.max_steepness / 1e9 == pytest.approx(steepness, rel=1e-4)
    assert wave.charge == pytest.approx(charge, abs=6e-6)
    assert wave.specific_energy == pytest.approx(energy, rel=tolerance)


def test_sum_rule():
    wave = heidler_sum(SUMS["Nucci 1990"][0])
    digits(wave.specific_energy, 6607.448, 3)
    digits(
        sum(part.specific_energy for part in wave.parts), 6350.077, 3
    )  # what forgetting the product would give


def test_composite_flash():
    stroke = Heidler(200e3, 19e-6, 485e-6, normalise="standard", k=0.93)
    long_stroke = Rectangle(400.0, 0.5)
    together, apart = stroke + long_stroke, stroke + long_stroke.delayed(0.1)
    digits(together.charge, 300.2314, 4)
    digits(together.specific_energy, 10_435_511.7, 1)
    digits(apart.specific_energy, 10_355_326.6, 1)


@pytest.mark.parametrize(
    ("t1", "t2", "definition", "alpha", "beta", "ratio", "crest", "q", "w"),
    [
        (10, 350, "10/90", 2127.1771, 246065.92, 1.051387, 19.4754, 489.9910, 253.1697),
        (10, 350, "30/90", 2114.8730, 292239.11, 1.044136, 16.9878, 490.1383, 252.2087),
        (1, 200, "10/90", 3517.0681, 2674245.1, 1.010103, 2.4839, 286.8225, 144.4796),
        (0.25, 100, "10/90", 6986.4467, 10822791.6, 1.005405, 0.6791, 143.8150, 72.2029),
        (10, 1000, "10/90", 712.4059, 262026.67, 1.019006, 22.6071, 1426.4843, 722.8569),
        (1, 20, "10/90", 39138.860, 2309879.6, 1.091306, 1.7958, 27.4105, 14.4582),
        (1.2, 50, "30/90", 14659.109, 2468926.7, 1.037252, 2.0888, 70.3381, 36.0485),
    ],
)
def test_double_exponential_of_standard_shapes(t1, t2, definition, alpha, beta, ratio, crest, q, w):
    wave = DoubleExponential.from_times(1.0, t1 * US, t2 * US, definition)
    assert wave.alpha == pytest.approx(alpha, rel=6e-8)
    assert wave.beta == pytest.approx(beta, rel=3e-8)
    digits(wave.amplitude, ratio, 6)
    digits(wave.peak_time / US, crest, 4)
    digits(wave.charge / US, q, 4)
    digits(wave.specific_energy / US, w, 4)


@pytest.mark.parametrize(
    ("a", "rise", "tail", "definition", "peak", "front", "half"),
    [
        (1.037, 0.4074, 68.22, "30/90", 0.99976, 1.19986, 50.0018),
        (1.019, 3.827, 1404, "10/90", 0.999997, 10.0006, 1000.21),
    ],
)
def test_product_form_of_c62_41(a, rise, tail, definition, peak, front, half):
    alpha, beta = 1 / (tail * US), 1 / (rise * US) + 1 / (tail * US)
    wave = DoubleExponential.from_amplitude(a, alpha, beta)
    assert wave.peak == pytest.approx(peak, abs=6e-6)
    assert wave.front_time(definition) / US == pytest.approx(front, rel=1e-5)
    assert wave.half_value_time(definition) / US == pytest.approx(half, rel=1e-5)


def test_8_20_of_c62_41():
    wave = PowerExponential(1.0, 3.0, 3.911e-6)
    digits(wave.front_time() / US, 8.02270, 5)
    digits(wave.half_value_time() / US, 19.93823, 5)
    digits(wave.charge / US, 17.456563, 6)
    digits(wave.specific_energy / US, 12.174460, 6)
    # 0.01243 per µs³ is the printed constant of t³·e^(−t/τ)
    digits(0.01243 * (3 * 3.911) ** 3 * np.exp(-3), 0.99957, 5)


@pytest.mark.parametrize(
    ("text", "p", "tau", "q", "w"),
    [
        ("8/20", 2.9306485, 3.9762348, 17.552807, 12.237635),
        ("4/10", 2.9306485, 1.9881174, 8.776404, 6.118817),
    ],
)
def test_exact_short_shapes(text, p, tau, q, w):
    wave = designation(text, 1.0)
    assert isinstance(wave, PowerExponential)
    digits(wave.p, p, 7)
    digits(wave.tau / US, tau, 7)
    digits(wave.charge / US, q, 6)
    digits(wave.specific_energy / US, w, 6)


def test_half_peak_width_of_8_20():
    digits(designation("8/20", 1.0).half_value_time("50/50") / US, 16.24060, 5)


@pytest.mark.parametrize(
    ("wave", "charge", "energy"),
    [
        (Rectangle(3.0, 5.0), 15, 45),
        (Trapezoid(3.0, 2.0, 5.0, 0.0), 3 * (5 - 1), 9 * (5 - 4 / 3)),
        (Triangle(3.0, 2.0, 5.0), 7.5, 15),
        (LinearFront(3.0, 2.0, 5.0), 3 * (1 + 5), 9 * (2 / 3 + 2.5)),
        (LinearFront(3.0, 0.0, 5.0), 15, 22.5),
        (Rectangle(400.0, 0.5), 200, 80e3),
        (Rectangle(300.0, 0.5), 150, 45e3),
        (Rectangle(200.0, 0.5), 100, 20e3),
    ],
)
def test_straight_shapes(wave, charge, energy):
    assert wave.charge == pytest.approx(charge, rel=1e-14)
    assert wave.specific_energy == pytest.approx(energy, rel=1e-14)


CONCAVE = [
    ((31.1e3, 3.83e-6 / 0.6, 24.3e9, 77.5e-6), (18.5495, 11.0460, 30.9206, 6.4541, 3.07189, 47_480.97)),
    ((31.1e3, 3.83e-6, 24.3e9, 77.5e-6), (10.3020, 6.20152, 30.9301, 3.9120, 3.25571, 50_543.6)),
    ((12.3e3, 0.67e-6 / 0.6, 39.9e9, 30.2e-6), (12.9373, 1.86766, 12.2547, 1.1308, 0.509189, 3125.97)),
]


@pytest.mark.parametrize(("given", "found"), CONCAVE)
def test_concave_front(given, found):
    wave, c = ConcaveFront(*given), cigre.concave(*given)
    power, steepest, peak, front, charge, energy = found
    assert c.power == pytest.approx(power, rel=5e-6)
    assert c.steepest / US == pytest.approx(steepest, rel=5e-6)
    digits(wave.peak / 1e3, peak, 4)
    assert wave.front_time("30/90") / US == pytest.approx(front, abs=6e-5)
    assert wave.charge == pytest.approx(charge, rel=3e-6)
    assert wave.specific_energy == pytest.approx(energy, rel=2e-6)


@pytest.mark.parametrize(("given", "found"), CONCAVE)
def test_concave_front_is_smooth_where_front_and_tail_meet(given, found):
    wave, c = ConcaveFront(*given), cigre.concave(*given)
    after = c.steepest * (1 + 1e-12)
    for time in (c.steepest, after):
        assert wave.current(time) == pytest.approx(0.9 * given[0], rel=1e-10)
        assert wave.slope(time) == pytest.approx(given[2], rel=1e-9)
    assert wave.max_steepness == pytest.approx(given[2], rel=1e-12)


# I0, alpha, beta, then peak (kA), its time (µs), Q (C), W/R (A²s), T1, T2 (µs), di/dt at 0 (A/s)
AIRCRAFT = {
    "A": ((218810, 11354, 647265), (199.9999, 6.35810, 18.933569, 2.000008e6, 3.5546, 69.170, 1.39144e11)),
    "AH": ((164903, 16065, 858888), (149.9996, 4.72103, 10.072741, 8.000145e5, 2.6588, 49.195, 1.38984e11)),
    "B": ((11300, 700, 2000), (4.1734, 807.556, 10.492857, 2.854446e4, 566.19, 2370.7, 1.469e7)),
    "D": ((109405, 22708, 1294530), (99.9999, 3.17905, 4.733392, 2.500010e5, 1.7773, 34.585, 1.39144e11)),
    "D/2": ((54703, 22708, 1294530), (50.0004, 3.17905, 2.366718, 6.250139e4, 1.7773, 34.585, 6.957e10)),
    "H": ((10572, 187191, 19105100), (10.0001, 0.24451, 0.055924, 289.876, 0.1275, 4.0075, 2.0000e11)),
}


@pytest.mark.parametrize("name", AIRCRAFT)
def test_aircraft_components(name):
    constants, (peak, crest, charge, energy, front, half, steepness) = AIRCRAFT[name]
    wave = DoubleExponential.from_amplitude(*constants)
    assert wave.amplitude == pytest.approx(constants[0], rel=1e-14)
    digits(wave.peak / 1e3, peak, 4)
    assert wave.peak_time / US == pytest.approx(crest, rel=2e-5)
    digits(wave.charge, charge, 6)
    assert wave.specific_energy == pytest.approx(energy, rel=2e-6)
    assert wave.front_time() / US == pytest.approx(front, rel=2e-4)
    assert wave.half_value_time() / US == pytest.approx(half, rel=2e-5)
    assert wave.max_steepness == pytest.approx(steepness, rel=4e-5)


def test_aircraft_component_b_in_five_milliseconds():
    wave = DoubleExponential.from_amplitude(*AIRCRAFT["B"][0])
    digits(wave.charge_until(5e-3), 10.00564, 5)
    digits(wave.mean_absolute(5e-3), 2001.13, 2)


def test_aircraft_component_a_in_500_microseconds():
    wave = DoubleExponential.from_amplitude(*AIRCRAFT["A"][0])
    digits(wave.specific_energy_until(500e-6) / 1e6, 1.999983, 6)


def test_limit_of_the_double_exponential():
    # t·e^(−t): the shortest tail that a double exponential can come near
    wave = PowerExponential(1.0, 1.0, 1.0)
    digits(wave.front_time(), 0.7126501, 7)
    digits(wave.half_value_time(), 2.7113908, 7)
    digits(wave.half_value_time() / wave.front_time(), 3.804659, 6)
    digits(wave.half_value_time("30/90") / wave.front_time("30/90"), 3.469976, 6)
    digits(wave.specific_energy / wave.charge, 0.67957, 5)


@pytest.mark.parametrize(
    ("n", "a", "rho"),
    [
        (10, 0.01, 0.5042),
        (10, 0.1, 0.5233),
        (10, 0.5, 0.5641),
        (10, 1, 0.5913),
        (2, 0.01, 0.5297),
        (2, 1, 0.6608),
    ],
)
def test_energy_over_peak_and_charge_of_one_heidler_function(n, a, rho):
    wave = Heidler(1.0, a, 1.0, n)
    digits(wave.specific_energy / wave.charge, rho, 4)


@pytest.mark.parametrize("n", [2, 3, 10, 30, 85, 116])
def test_heidler_integrals_by_two_ways(n):
    a = np.geomspace(1e-4, 1.0, 25)
    fast, closed = pulses.heidler_integrals(a, n), pulses.heidler_integrals_closed(a, n)
    np.testing.assert_allclose(fast[0], closed[0], rtol=2e-13)
    np.testing.assert_allclose(fast[1], closed[1], rtol=3e-12)  # the closed form loses digits near a = 1
