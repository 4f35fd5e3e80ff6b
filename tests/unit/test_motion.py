"""Beam modes, oscillators under loads in time, spans; and the dimensions of the laws of loops and spans."""

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from strikeenergy.note import Formula
from strikeenergy.physics import loops, motion, oscillator
from strikeenergy.units import registry

UNITS = {
    "i2": "A**2", "mu0": "H/m", "l": "m", "d": "m", "r": "m", "b": "m", "a": "m", "s": "m", "t": "m", "R": "m", "u": "",
    "n": "", "sigma_y": "Pa", "E_Y": "Pa", "nu": "", "gamma": "kg/m**3", "J_p": "Pa*s", "lambda_": "", "EI": "N*m**2",
    "m": "kg/m", "k": "", "w": "N/m", "M": "N*m", "Z": "m**3", "J": "N*s/m", "A": "m**2", "omega": "1/s", "T_W": "s",
    "v0": "m/s", "M_p": "N*m",
}  # fmt: skip
RESULTS = {
    "MUTUAL": "H", "PARALLEL_PROXIMITY": "N/m", "TAPES_FACE": "N/m", "U_CROSSBAR": "N", "U_CROSSBAR_PERFECT": "N",
    "RECTANGLE_INDUCTANCE": "H", "RECTANGLE_SIDE": "N", "CIRCLE_INDUCTANCE": "H", "CIRCLE_TENSION": "N",
    "COIL_LONG_FORCE": "N", "TUBE_HOOP_THICK": "Pa", "TUBE_HOOP_THIN": "Pa", "TUBE_YIELD_CURRENT_THICK": "A",
    "TUBE_YIELD_CURRENT_THIN": "A", "RING_BUCKLING": "Pa", "RING_BREATHING": "Hz", "WALL_SPEED": "m/s", "SHARED": "A**2",
    "RING_OF_N": "N/m", "NATURAL_FREQUENCY": "Hz", "STATIC_DEFLECTION": "m", "STATIC_MOMENT": "N*m",
    "STATIC_REACTION": "N", "BENDING_STRESS": "Pa", "IMPULSE_SPEED": "m/s", "IMPULSE_MOMENT": "N*m",
    "IMPULSE_DEFLECTION": "m", "IMPULSE_REACTION": "N", "IMPULSE_STRESS_ROD": "Pa", "SHORT_PULSE_FACTOR": "",
    "PLASTIC_MOMENT_ROD": "N*m", "PLASTIC_DEFLECTION": "m",
}  # fmt: skip
LAWS = {
    name: law for module in (loops, motion) for name, law in vars(module).items() if isinstance(law, Formula)
}


def hump(number=400):
    t = np.concatenate([[0.0], np.geomspace(1e-6, 4e-3, number)])
    return t, 1e5 * (np.exp(-t / 4e-4) - np.exp(-t / 2e-5))


def gauss(n):
    x, w = np.polynomial.legendre.leggauss(n)
    return (x + 1) / 2, w / 2


# -- laws --------------------------------------------------------------------------------------------------


def test_every_law_is_held_against_its_dimension():
    # the logarithms of lengths in TAPES_EDGE cancel in units: checked through its scaling
    assert set(LAWS) == set(RESULTS) | {"TAPES_EDGE"}


@pytest.mark.parametrize("name", sorted(RESULTS))
def test_dimension(name):
    law, ureg = LAWS[name], registry()
    numbers = {n: 2.0 + 0.1 * k for k, n in enumerate((*law.names, "mu0"))}
    numbers |= {k: v for k, v in {"nu": 0.3, "r": 0.4, "b": 9.0, "t": 0.5}.items() if k in numbers}
    quantities = {n: ureg.Quantity(v, UNITS[n] or "dimensionless") for n, v in numbers.items()}
    result = law(**quantities).to(RESULTS[name] or "dimensionless")
    assert result.magnitude == pytest.approx(float(law(**numbers)), rel=1e-12)


def test_scale_of_the_tapes():
    one = loops.TAPES_EDGE(i2=1.0, b=0.025, s=0.06)
    assert loops.TAPES_EDGE(i2=4.0, b=0.05, s=0.12) == pytest.approx(2 * one, rel=1e-12)


# -- modes -------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("ends", motion.ENDS)
def test_modes_are_orthonormal_to_the_fortieth(ends):
    x, w = gauss(220)
    m = motion.modes(ends, 40)
    phi = motion.shapes(m, x)
    np.testing.assert_allclose((phi * w) @ phi.T, np.eye(40), atol=1e-12)
    np.testing.assert_allclose(phi @ w, m.participation, atol=1e-12)
    # and so are their curvatures, which store the elastic energy λ⁴/2
    curved = motion.shapes(m, x, 2) / m.lam[:, None] ** 2
    np.testing.assert_allclose((curved * w) @ curved.T, np.eye(40), atol=1e-12)


@pytest.mark.parametrize("ends", motion.ENDS)
def test_ends_are_held(ends):
    m = motion.modes(ends, 60)
    held = {"pinned-pinned": "02 02", "fixed-fixed": "01 01", "fixed-pinned": "01 02", "cantilever": "01 23"}
    for place, which in zip((0.0, 1.0), held[ends].split(), strict=True):
        for derivative in map(int, which):
            value = motion.shapes(m, place, derivative)[:, 0] / m.lam**derivative
            np.testing.assert_allclose(value, 0, atol=2e-12)


@pytest.mark.parametrize("ends", motion.ENDS)
@pytest.mark.parametrize("derivative", [0, 1, 2])
def test_derivatives(ends, derivative):
    m, h = motion.modes(ends, 8), 1e-5
    slope = (motion.shapes(m, 0.37 + h, derivative) - motion.shapes(m, 0.37 - h, derivative)) / (2 * h)
    expected = motion.shapes(m, 0.37, derivative + 1)
    assert np.abs((slope - expected) / m.lam[:, None] ** (derivative + 1)).max() < 1e-7


@pytest.mark.parametrize("ends", motion.ENDS)
def test_energy_of_a_uniform_impulse(ends):
    # ½·m·v0²·l is shared among the modes as Γ²; what the first n leave is that of a discontinuity, falling with 1/n
    left = [1 - (motion.modes(ends, n).participation ** 2).sum() for n in (100, 1000)]
    assert 0 < left[1] < 5e-4 * 2
    assert left[1] == pytest.approx(left[0] / 10, rel=0.02)


@pytest.mark.parametrize("ends", motion.ENDS)
def test_static_answer_is_the_sum_of_the_modes(ends):
    m, xi = motion.modes(ends, 600), np.linspace(0, 1, 9)
    for derivative, within in ((0, 1e-12), (1, 1e-9), (2, 1e-6), (3, 2e-3)):
        total = (m.participation / m.lam**4) @ motion.shapes(m, xi, derivative)
        np.testing.assert_allclose(total, motion.static_shapes(ends, xi)[derivative], atol=within)


def test_unknown_ends():
    with pytest.raises(ValueError, match="unknown ends 'welded'; there are pinned-pinned, fixed-fixed"):
        motion.modes("welded", 1)


# -- oscillators -------------------------------------------------------------------------------------------


def reference(load, frequency, damping, times):
    w = 2 * np.pi * frequency
    nodes = load.time if isinstance(load, oscillator.Pulse) else np.linspace(0, times[-1], 60)
    state, out, last = np.zeros(2), [], 0.0
    for t in times:  # from corner to corner, where the right-hand side is smooth
        for end in [*nodes[(nodes > last) & (nodes < t)], t]:
            run = solve_ivp(
                lambda s, y: [y[1], w**2 * (oscillator.load_at(load, np.array([s]))[0] - y[0]) - 2 * damping * w * y[1]],
                (last, end), state, rtol=1e-10, atol=1e-12, method="DOP853",
            )  # fmt: skip
            state, last = run.y[:, -1], end
        out.append(state[0])
    return np.array(out)


@pytest.mark.parametrize("damping", [0.0, 0.05])
@pytest.mark.parametrize("kind", ["straight", "parabolic", "exponential"])
def test_exact_against_an_ode_solver(kind, damping):
    t = np.array([0.0, 0.3, 0.5, 1.4, 1.6, 3.0])
    i = np.array([0.0, 1.0, 0.7, 0.2, 0.9, 0.1])
    load = {
        "straight": oscillator.Pulse(t, i),
        "parabolic": oscillator.pulse_of_current(t, i, 2.0),
        "exponential": oscillator.exponentials_of_current([1.0, -1.0], [1.0, 0.2], 2.0),
    }[kind]
    times = np.array([0.1, 0.5, 0.9, 1.6, 2.95])
    for f in (0.01, 0.4, 3.0):
        got = oscillator.oscillators(load, 2 * np.pi * f, times, damping)[:, 0]
        np.testing.assert_allclose(got, reference(load, f, damping, times), rtol=1e-7, atol=1e-9)


def test_many_oscillators_are_each_alone():
    load, times = oscillator.pulse_of_current(*hump(60)), np.linspace(-1e-4, 1e-2, 40)
    omega = 2 * np.pi * np.geomspace(1, 1e5, 7)
    together = oscillator.oscillators(load, omega, times)
    assert together.shape == (40, 7)
    assert (together[times < 0] == 0).all()
    for k, w in enumerate(omega):
        np.testing.assert_allclose(together[:, k], oscillator.oscillators(load, w, times)[:, 0], rtol=1e-12)


def test_a_finer_cut_of_the_same_load_changes_nothing():
    t, i = hump(50)
    fine = np.union1d(t, np.linspace(0, t[-1], 777))
    f = np.array([5.0, 300.0, 20e3])
    one, two = (oscillator.pulse_of_current(s, np.interp(s, t, i)) for s in (t, fine))
    assert oscillator.impulse(one) == pytest.approx(oscillator.impulse(two), rel=1e-12)
    times = np.linspace(0, 1e-2, 500)
    a, b = (oscillator.oscillators(p, 2 * np.pi * f, times) for p in (one, two))
    np.testing.assert_allclose(a, b, rtol=0, atol=1e-9 * np.abs(a).max())


def test_impulse_is_the_specific_energy():
    # a ramp to 2 A in 3 s: ∫ i² dt = 2²·3/3
    assert oscillator.impulse(oscillator.pulse_of_current([0, 3], [0, 2])) == pytest.approx(4.0, rel=1e-14)
    double = oscillator.exponentials_of_current([1.0, -1.0], [2.0, 0.5])
    assert oscillator.impulse(double) == pytest.approx(1.0 + 0.25 - 2 / 2.5, rel=1e-14)


def test_load_factor_of_steps_and_ramps():
    step = oscillator.Pulse(np.array([0.0, 100.0]), np.array([3.0, 3.0]))
    assert oscillator.dynamic_load_factor(step, 1.0) == pytest.approx(2.0, rel=1e-6)
    # damped: 1 + exp(−π·ζ/sqrt(1 − ζ²))
    damped = oscillator.dynamic_load_factor(step, 1.0, 0.1)
    assert damped == pytest.approx(1 + np.exp(-np.pi * 0.1 / np.sqrt(0.99)), rel=1e-5)
    # a short rectangle: 2·sin(π·f·T)
    short = oscillator.Pulse(np.array([0.0, 0.2]), np.array([3.0, 3.0]))
    assert oscillator.dynamic_load_factor(short, 0.5) == pytest.approx(2 * np.sin(0.1 * np.pi), rel=1e-6)


def test_strokes_far_apart_are_all_seen():
    t, i = hump(100)
    two = oscillator.pulse_of_current(np.r_[t, t + 0.5], np.r_[i, 2 * i])
    one = oscillator.pulse_of_current(t, i)
    f = np.array([400.0, 5e3])
    # the second, twice as high, on what is left of the first: at least its own answer less that of the first
    alone = oscillator.dynamic_load_factor(one, f)
    both = oscillator.dynamic_load_factor(two, f)
    assert (both >= 0.75 * alone - 1e-3).all()
    assert (both <= 1.25 * alone + 1e-3).all()
    lone = oscillator.dynamic_load_factor(two, f, damping=0.1)  # here the first has died away
    np.testing.assert_allclose(lone, oscillator.dynamic_load_factor(one, f, damping=0.1), rtol=2e-4)


@pytest.mark.parametrize("damping", [-0.1, 1.0, np.nan])
def test_impossible_damping(damping):
    with pytest.raises(ValueError, match="damping ratio"):
        oscillator.oscillators(oscillator.Pulse(np.array([0.0, 1.0]), np.ones(2)), 1.0, 0.5, damping)


@pytest.mark.parametrize(
    ("t", "i"), [([0], [1]), ([0, 1], [1]), ([0, 1, 1], [0, 1, 2]), ([0, np.nan], [0, 1])]
)
def test_impossible_samples(t, i):
    with pytest.raises(ValueError, match="rising times"):
        oscillator.pulse_of_current(t, i)


# -- spans -------------------------------------------------------------------------------------------------

SPAN = {"length": 0.6, "stiffness": 42.0, "mass": 0.39}


def span(ends, load, **more):
    return motion.span_response(load, ends, **(SPAN | more))


@pytest.mark.parametrize("ends", motion.ENDS)
def test_slow_load_bends_as_a_steady_one(ends):
    slow = oscillator.Pulse(np.array([0.0, 40.0, 80.0]), np.array([0.0, 30.0, 0.0]))
    got, table = span(ends, slow, number=10), motion.STATIC[ends]
    length, stiffness = SPAN["length"], SPAN["stiffness"]
    y, _, moment, _ = np.abs(motion.static_shapes(ends, got.xi))
    np.testing.assert_allclose(got.deflection, 30 * y * length**4 / stiffness, rtol=2e-3, atol=1e-12)
    np.testing.assert_allclose(got.moment, 30 * moment * length**2, rtol=2e-3, atol=2e-3)
    reactions = np.array([table.reaction_start, table.reaction_end]) * 30 * length
    np.testing.assert_allclose(got.reaction, reactions, rtol=3e-3, atol=3e-3)


@pytest.mark.parametrize("ends", motion.ENDS)
def test_short_pulse_moves_as_an_impulse(ends):
    sharp = oscillator.Pulse(np.array([0.0, 1e-7, 2e-7]), np.array([0.0, 1e7, 0.0]))
    got = span(ends, sharp, number=1, xi=[0.5])
    k = motion.impulse_factors(ends, 0.5)[0, 0, 0]
    expected = motion.IMPULSE_DEFLECTION(k=k, J=1.0, l=SPAN["length"], EI=SPAN["stiffness"], m=SPAN["mass"])
    assert got.deflection[0] == pytest.approx(expected, rel=0.02)


@pytest.mark.parametrize("ends", motion.ENDS)
def test_stated_error_holds(ends):
    load = oscillator.pulse_of_current(*hump(), 4e-7)
    best = span(ends, load, number=100)
    for number in (6, 12, 40):
        few = span(ends, load, number=number)
        for name in ("deflection", "moment", "reaction"):
            off = np.abs(getattr(few, name) - getattr(best, name))
            stated = getattr(few, f"{name}_error") + getattr(best, f"{name}_error")
            assert (off <= stated).all(), (name, number)
    few = span(ends, load)
    assert (few.moment_error <= 1e-3 * few.moment.max()).all()
    assert (few.reaction_error <= 0.02 * few.reaction.max()).all()


@pytest.mark.parametrize("ends", motion.ENDS)
def test_energy_is_kept(ends):
    # The work of the load is the kinetic and elastic energy of the modes when it has ended, and stays so.
    load = oscillator.pulse_of_current(*hump(), 4e-7)
    m = motion.modes(ends, 30)
    omega = m.lam**2 / SPAN["length"] ** 2 * np.sqrt(SPAN["stiffness"] / SPAN["mass"])
    t = np.linspace(0, 4e-3, 40_001)
    u = oscillator.oscillators(load, omega, t)
    speed = np.gradient(u, t, axis=0, edge_order=2)
    scale = m.participation**2 * SPAN["length"] / (SPAN["mass"] * omega**2)
    work = np.trapezoid(oscillator.load_at(load, t)[:, None] * speed, t, axis=0) * scale
    late = 4e-3 + np.linspace(0, 0.05, 7)
    after = oscillator.oscillators(load, omega, np.concatenate([late, late + 1e-8, late - 1e-8]))
    u, rate = after[:7], (after[7:14] - after[14:]) / 2e-8
    energy = scale / 2 * (u[1:] ** 2 + (rate[1:] / omega) ** 2)
    np.testing.assert_allclose(
        energy, np.broadcast_to(energy[0], energy.shape), rtol=1e-4, atol=1e-7 * energy.max()
    )
    np.testing.assert_allclose(work, energy[0], rtol=2e-3, atol=2e-5 * energy[0].max())


@pytest.mark.parametrize(("later", "factor"), [(3.0, 2.0), (2.5, 1.0)])
def test_second_stroke_in_step_and_out_of_step(later, factor):
    # Every mode of a pinned span repeats with the first: n²·f1. A stroke that comes in step doubles the motion; one
    # that comes half a period late stops all odd modes, and the first stroke's answer stays the highest.
    t, i = hump()
    f1 = np.pi / 2 / SPAN["length"] ** 2 * np.sqrt(SPAN["stiffness"] / SPAN["mass"])
    one = span("pinned-pinned", oscillator.pulse_of_current(t, i, 4e-7))
    two = span("pinned-pinned", oscillator.pulse_of_current(np.r_[t, t + later / f1], np.r_[i, i], 4e-7))
    np.testing.assert_allclose(two.deflection, factor * one.deflection, rtol=2e-3, atol=1e-12)
    np.testing.assert_allclose(two.moment[1:4], factor * one.moment[1:4], rtol=2e-2)


def test_damping_lowers():
    load = oscillator.pulse_of_current(*hump(), 4e-7)
    free, damped = span("fixed-fixed", load), span("fixed-fixed", load, damping=0.05)
    assert (damped.moment[1:4] < free.moment[1:4]).all()
    assert (damped.reaction < free.reaction).all()


def test_exponentials_and_samples_of_one_current_agree():
    t, i = hump(3000)
    sampled = span("pinned-pinned", oscillator.pulse_of_current(t, i, 4e-7), xi=[0.5])
    closed = span(
        "pinned-pinned", oscillator.exponentials_of_current([1e5, -1e5], [4e-4, 2e-5], 4e-7), xi=[0.5]
    )
    assert closed.moment[0] == pytest.approx(sampled.moment[0], rel=1e-3)
    assert closed.deflection[0] == pytest.approx(sampled.deflection[0], rel=1e-4)
    assert closed.reaction == pytest.approx(sampled.reaction, rel=1e-2)
