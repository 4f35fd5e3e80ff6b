"""Spans under i²(t): published beam factors, and a worked span computed apart from this program with other software.

Beam tables: any handbook; natural frequencies as IEC 60865-1 prints them, 1.57, 2.45 and 3.56; characteristic numbers
as D. Young and R. P. Felgar (1949) tabulate them. Dynamic load factors: of the Heidler functions of IEC 62305-1:2010
Annex B with the exact peak correction, computed by quadrature of Duhamel's integral and checked by an independent
integration of the differential equation (agreement 2e-5).
"""

import numpy as np
import pytest

from strikeenergy.physics import magnetics, motion, oscillator, pulses

FREQUENCIES = np.array([10, 50, 100, 200, 500, 1000, 2000, 5000, 10_000], dtype=float)
FACTORS = {
    (19e-6, 485e-6): [0.01610, 0.08026, 0.15916, 0.3082, 0.66192, 1.02569, 1.38863, 1.74559, 1.89285],
    (1.82e-6, 285e-6): [0.00907, 0.04531, 0.09036, 0.1786, 0.41601, 0.71155, 1.06816, 1.49782, 1.72334],
    (0.454e-6, 143e-6): [0.00453, 0.02262, 0.04521, 0.09016, 0.22081, 0.41488, 0.7092, 1.1777, 1.4907],
}


def heidler(peak, tau1, tau2, k=None, number=1500):
    k = float(pulses.heidler_correction(tau1, tau2, 10.0)) if k is None else k
    t = np.concatenate([[0.0], np.geomspace(0.1 * tau1, 25 * tau2, number)])
    return t, pulses.heidler_current(t, peak, tau1, tau2, 10.0, k)


@pytest.mark.parametrize("constants", FACTORS)
def test_dynamic_load_factors_of_the_standard_strokes(constants):
    load = oscillator.pulse_of_current(*heidler(1.0, *constants))
    got = oscillator.dynamic_load_factor(load, FREQUENCIES)
    np.testing.assert_allclose(got, FACTORS[constants], rtol=0, atol=3e-5)


def test_short_pulse_rule():
    load = oscillator.pulse_of_current(*heidler(1.0, 19e-6, 485e-6))
    t_w = oscillator.impulse(load) / oscillator.extent(load).peak
    assert t_w == pytest.approx(256.2315e-6, rel=2e-5)
    rule = motion.SHORT_PULSE_FACTOR(omega=2 * np.pi * np.array([100.0, 500.0]), T_W=t_w)
    over = rule / oscillator.dynamic_load_factor(load, [100.0, 500.0]) - 1
    assert over == pytest.approx([0.012, 0.22], abs=0.005)


def test_exponential():
    a = np.array([0.1, 0.2, 0.5, 1, 2, 5, 10, 100])
    table = [0.0995, 0.19612, 0.45069, 0.7562, 1.11066, 1.52015, 1.72815, 1.96907]
    np.testing.assert_allclose(oscillator.exponential_load_factor(a), table, rtol=0, atol=1e-5)
    # as the square of a current exp(−t/2): the force decays with θ = 1
    load = oscillator.exponentials_of_current([1.0], [2.0])
    got = oscillator.dynamic_load_factor(load, a / (2 * np.pi))
    np.testing.assert_allclose(got, table, rtol=0, atol=2e-5)


@pytest.mark.parametrize(
    ("ends", "numbers", "gamma"),
    [
        ("pinned-pinned", [3.14159265, 6.28318531], 1.571),
        ("fixed-pinned", [3.92660231, 7.06858275], 2.454),
        ("fixed-fixed", [4.73004074, 7.85320462], 3.561),
        ("cantilever", [1.87510407, 4.69409113], 0.560),
    ],
)
def test_natural_frequencies(ends, numbers, gamma):
    lam = motion.modes(ends, 2).lam
    np.testing.assert_allclose(lam, numbers, rtol=0, atol=6e-9)
    assert motion.NATURAL_FREQUENCY(lambda_=lam[0], l=1.0, EI=1.0, m=1.0) == pytest.approx(gamma, abs=5.1e-4)


@pytest.mark.parametrize(
    ("ends", "place", "row", "factor"),
    [
        ("pinned-pinned", 0.5, 1, 1.2732395),
        ("pinned-pinned", 0.0, 2, 4.0),
        ("fixed-fixed", 0.0, 1, 1.661723),
        ("fixed-fixed", 0.5, 1, 1.010032),
        ("fixed-fixed", 0.5, 0, 0.058978),
        ("cantilever", 0.0, 1, 1.565984),
        ("cantilever", 1.0, 0, 0.445386),
        ("fixed-pinned", 0.0, 1, 1.720002),
    ],
)
def test_impulse_factors(ends, place, row, factor):
    assert motion.impulse_factors(ends, place)[row, 0, 0] == pytest.approx(factor, abs=6e-7)


def test_participation_of_the_fixed_span():
    first = motion.modes("fixed-fixed", 1)
    assert first.participation[0] == pytest.approx(0.830862, abs=5e-7)
    assert first.lam[0] ** 2 == pytest.approx(22.373285, abs=5e-7)


def test_beam_tables():
    t = motion.STATIC
    assert t["pinned-pinned"][:5] == (5 / 384, 0, 1 / 8, 1 / 2, 1 / 2)
    assert t["fixed-fixed"][:5] == (1 / 384, 1 / 12, 1 / 24, 1 / 2, 1 / 2)
    assert t["fixed-pinned"][:5] == pytest.approx((0.0054161, 1 / 8, 9 / 128, 5 / 8, 3 / 8), abs=5e-8)
    assert t["cantilever"][:5] == (1 / 8, 1 / 2, 0, 1, 0)
    # the factor β of IEC 60865-1 is 1, 8/11 and 8/16
    assert [t[e].beta for e in ("pinned-pinned", "fixed-pinned", "fixed-fixed")] == pytest.approx(
        [1, 8 / 11, 0.5], abs=0.003
    )
    # and the tables are those of the deflection curves
    xi = np.linspace(0, 1, 4001)
    for ends, row in t.items():
        y, _, moment, shear = motion.static_shapes(ends, xi)
        assert y.max() == pytest.approx(row.deflection, rel=1e-6)
        assert abs(moment[0]) == pytest.approx(row.moment_start, abs=1e-12)
        assert -moment.min() == pytest.approx(row.moment_span, rel=1e-6, abs=1e-12)
        assert np.abs(shear[[0, -1]]) == pytest.approx([row.reaction_start, row.reaction_end], abs=1e-12)


def test_worked_span():
    """Steel rod of 8 mm, pinned over 1 m, twin at 0.5 m, each with the first positive stroke of LPL III-IV."""
    modulus, density, d, length = 210e9, 7850.0, 8e-3, 1.0
    area, section_modulus = np.pi * d**2 / 4, np.pi * d**3 / 32
    stiffness, mass = modulus * np.pi * d**4 / 64, density * area
    t, i = heidler(100e3, 19e-6, 485e-6, k=0.93)
    load = oscillator.pulse_of_current(t, i, float(magnetics.PARALLEL_PER_LENGTH(i2=1.0, d=0.5)))
    assert i.max() == pytest.approx(100.127e3, abs=0.5)
    impulse, peak = oscillator.impulse(load), oscillator.extent(load).peak
    assert impulse == pytest.approx(1.02753, abs=1e-5)
    assert impulse / 4e-7 == pytest.approx(2.5688316e6, rel=5e-6)
    assert peak == pytest.approx(4010.17, abs=0.01)

    lam = motion.modes("pinned-pinned", 1).lam[0]
    assert motion.NATURAL_FREQUENCY(lambda_=lam, l=length, EI=stiffness, m=mass) == pytest.approx(
        16.2489, abs=5e-5
    )
    speed = motion.IMPULSE_SPEED(J=impulse, m=mass)
    assert speed == pytest.approx(2.6041, abs=6e-5)
    k = motion.impulse_factors("pinned-pinned", 0.5, 1)[:, 0, 0]
    first = motion.IMPULSE_DEFLECTION(k=k[0], J=impulse, l=length, EI=stiffness, m=mass)
    assert 1e3 * first == pytest.approx(32.476, abs=6e-4)
    moment = motion.IMPULSE_MOMENT(k=k[1], J=impulse, EI=stiffness, m=mass)
    assert moment == pytest.approx(13.5335, abs=1.1e-4)
    stress = motion.IMPULSE_STRESS_ROD(J=impulse, A=area, E_Y=modulus, gamma=density)
    assert stress / 1e6 == pytest.approx(269.24, abs=6e-3)
    assert motion.BENDING_STRESS(M=moment, Z=section_modulus) == pytest.approx(stress, rel=1e-12)
    all_modes = np.sqrt((motion.impulse_factors("pinned-pinned", 0.5, 20_000)[1, :, 0] ** 2).sum())
    assert all_modes == pytest.approx(np.sqrt(2), abs=2e-5)
    assert all_modes * moment / k[1] / section_modulus / 1e6 == pytest.approx(299.05, abs=0.01)

    # 21 modes that a uniform load moves: the first 41
    span = motion.span_response(load, "pinned-pinned", length, stiffness, mass, number=41, xi=[0.5])
    assert 1e3 * span.deflection[0] == pytest.approx(32.394, abs=6e-4)
    assert span.moment[0] / section_modulus / 1e6 == pytest.approx(379.2, abs=0.06)
    static = motion.STATIC_MOMENT(k=motion.STATIC["pinned-pinned"].moment_span, w=peak, l=length)
    assert static / section_modulus / 1e6 == pytest.approx(9972.5, abs=0.06)

    plastic = motion.PLASTIC_MOMENT_ROD(d=d, sigma_y=235e6)
    permanent = motion.PLASTIC_DEFLECTION(m=mass, v0=speed, l=length, M_p=plastic)
    assert 1e3 * permanent == pytest.approx(11.1, abs=0.05)
