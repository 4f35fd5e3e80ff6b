"""Magnetic forces against published worked figures and the configuration of IEC 62305-1:2010 Annex D.4.2.

The figure 100 kA, 0.10 m, 5 m -> 100 000 N stands in a public teaching page on forces between bars; 50 kA, 0.15 m, 1 m -> about
3300 N in another. The annex shows a right-angle corner with 100 kA and a leg of 0.5 m as a graph (recalled), so the
profile below is that of the Biot-Savart law, computed apart from this program.
"""

import math

import pytest

from strikeenergy.physics import magnetics

I2 = 100e3**2


def test_two_bars():
    assert 5 * magnetics.PARALLEL_PER_LENGTH(i2=I2, d=0.10) == pytest.approx(100e3, rel=1e-9)
    assert magnetics.PARALLEL_FINITE(i2=I2, d=0.10, l=5.0) == pytest.approx(98.02e3, rel=1e-5)
    assert magnetics.PARALLEL_PER_LENGTH(i2=50e3**2, d=0.15) == pytest.approx(3300, rel=0.02)


@pytest.mark.parametrize(
    ("length", "distance", "force"), [(1, 0.1, 18099.8), (1, 0.5, 2472.136), (1, 1, 828.427)]
)
def test_finite_pairs(length, distance, force):
    assert magnetics.PARALLEL_FINITE(i2=I2, d=distance, l=length) == pytest.approx(force, rel=5e-7 / 0.08)


@pytest.mark.parametrize(
    ("x", "kilonewton"),
    [(0.005, 199.990), (0.01, 99.980), (0.02, 49.960), (0.05, 19.9007), (0.1, 9.80581), (0.2, 4.64238), (0.3, 2.85831), (0.5, 1.41421)],
)  # fmt: skip
def test_profile_along_the_bend(x, kilonewton):
    assert magnetics.BEND_PER_LENGTH(i2=I2, x=x, l=0.5) / 1e3 == pytest.approx(kilonewton, rel=6e-6)


@pytest.mark.parametrize(
    ("x1", "x2", "force"),
    [(0.004, 0.5, 4640.10), (0.005, 0.5, 4416.97), (0.01, 0.5, 3723.90), (0.1, 0.5, 1431.06)],
)
def test_totals_on_the_leg(x1, x2, force):
    assert magnetics.BEND(i2=I2, x1=x1, x2=x2, l=0.5) == pytest.approx(force, abs=0.006)


def test_cut_off_of_a_spread_current():
    # inductance gradients of a square loop give 0.7767 r at r/side = 0.005; the limit is exp(-1/4) = 0.7788
    assert magnetics.BEND_CUTOFF_UNIFORM(r=1.0) == pytest.approx(math.exp(-0.25), rel=1e-15)


@pytest.mark.parametrize(
    ("radius", "current", "pascal"),
    [(9e-3, 100e3, 1.96488e6), (9e-3, 200e3, 7.8595e6), (4e-3, 100e3, 9.947e6)],
)
def test_pinch(radius, current, pascal):
    assert magnetics.PINCH_SURFACE(i2=current**2, r=radius) == pytest.approx(pascal, rel=5e-5)


def test_force_per_protection_level():
    # both conductors with the full current at 0.1 m: 80 / 45 / 20 kN/m and 20 / 11.2 / 5.0 N·s/m
    for peak, energy, force, impulse in (
        (200e3, 10e6, 80e3, 20),
        (150e3, 5.6e6, 45e3, 11.2),
        (100e3, 2.5e6, 20e3, 5),
    ):
        assert magnetics.PARALLEL_PER_LENGTH(i2=peak**2, d=0.1) == pytest.approx(force, rel=1e-9)
        assert magnetics.PARALLEL_PER_LENGTH(i2=energy, d=0.1) == pytest.approx(impulse, rel=1e-9)
