"""Field, force, moment and inductance of segments: what must hold whatever the geometry."""

import numpy as np
import pytest

from strikeenergy.physics import biot_savart as bs
from strikeenergy.physics import magnetics

RNG = np.random.default_rng(7)
BENT = np.array([[0, 0, 0], [1, 0, 0], [1, 0.6, 0.2], [0.3, 0.9, -0.1], [-0.2, 0.4, 0.5]], dtype=float)


def knot(n):
    """A closed curve that nowhere comes near itself."""
    t = np.arange(n) * 2 * np.pi / n
    r = 1 + 0.3 * np.cos(5 * t)
    return np.stack([r * np.cos(t), r * np.sin(t), 0.3 * np.sin(5 * t)], axis=1)


# -- field -------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("cutoff", [0.0, 0.02])
def test_segment_against_quadrature(cutoff):
    a, b, p = RNG.normal(size=(3, 3))
    nodes, weights = np.polynomial.legendre.leggauss(200)
    s = (nodes + 1) / 2
    away = p - (a + s[:, None] * (b - a))
    core = np.cross(b - a, away) / (np.sum(away**2, axis=1) + cutoff**2)[:, None] ** 1.5
    expected = 1e-7 * (weights[:, None] / 2 * core).sum(axis=0)
    np.testing.assert_allclose(bs.field(p, bs.chain([a, b]), cutoff), expected, rtol=1e-10)


@pytest.mark.parametrize("distance", [1e-12, 1e-9, 1e-6, 1e-3, 1.0, 1e3])
def test_near_and_far_from_a_segment(distance):
    segment = bs.chain([[0, 0, 0], [1, 0, 0]])
    b = bs.field([0.3, distance, 0], segment)[2]
    ends = 0.7 / np.hypot(0.7, distance) + 0.3 / np.hypot(0.3, distance)
    assert b == pytest.approx(1e-7 / distance * ends, rel=1e-13)


def test_zero_on_the_axis():
    segment = bs.chain([[1, 2, 3], [4, 5, 7]])
    a, d = segment.start[0], (segment.end - segment.start)[0]
    on_axis = a + np.array([-3, 0, 0.25, 1 / 3, 1, 8])[:, None] * d
    assert np.all(np.abs(bs.field(on_axis, segment)) < 1e-20)


def test_shapes_of_points():
    path = bs.chain(BENT)
    points = RNG.normal(size=(4, 5, 3))
    whole = bs.field(points, path)
    assert whole.shape == (4, 5, 3)
    np.testing.assert_array_equal(whole[2, 3], bs.field(points[2, 3], path))


def test_current_reversed_and_return_path():
    there, back = bs.chain(BENT), bs.chain(BENT[::-1])
    p = np.array([0.2, 0.3, 0.4])
    np.testing.assert_allclose(bs.field(p, back), -bs.field(p, there), rtol=1e-12)
    np.testing.assert_allclose(bs.field(p, bs.chain(BENT, share=-1)), -bs.field(p, there), rtol=1e-14)


def test_divergence_free_and_curl_free_off_the_wire():
    path, h = bs.chain(BENT, closed=True), 1e-4
    p = np.array([0.4, 0.3, 0.3])
    steps = h * np.eye(3)
    jacobian = (bs.field(p + steps, path) - bs.field(p - steps, path)) / (2 * h)
    size = np.abs(jacobian).max()
    assert abs(np.trace(jacobian)) < 1e-6 * size
    assert np.abs(jacobian - jacobian.T).max() < 1e-6 * size


@pytest.mark.parametrize("n", [3, 12, 1000, 4000])
def test_centre_of_a_circle(n):
    points = bs.arc_points([0, 0, 0], [0.5, 0, 0], [0, 0, 1], 2 * np.pi, n)[:-1]
    ring = bs.chain(points, closed=True)
    polygon = 4e-7 * np.pi / (2 * 0.5) * n / np.pi * np.tan(np.pi / n)
    assert bs.field([0, 0, 0], ring)[2] == pytest.approx(polygon, rel=1e-14)
    assert bs.field_fast(np.zeros((1, 3)), ring)[0, 2] == pytest.approx(polygon, rel=1e-14)
    assert polygon == pytest.approx(4e-7 * np.pi, rel=6 / n**2 + 1e-15)


@pytest.mark.parametrize("cutoff", [0.0, 0.003])
@pytest.mark.parametrize("gaps", [False, True])
def test_fast_form(cutoff, gaps):
    path = bs.chain(knot(300), closed=True)
    if gaps:  # segments in no order share no ends
        order = RNG.permutation(300)
        path = bs.Segments(*(part[order] for part in path))
    middle = (path.start + path.end) / 2
    exact = bs.field(middle, path, cutoff)
    fast = bs.field_fast(middle, path, cutoff)
    assert np.abs(fast - exact).max() <= 1e-10 * np.abs(exact).max()


# -- geometry ----------------------------------------------------------------------------------------------


def test_cutoffs():
    assert bs.cutoffs(0.004) == pytest.approx((0.004, 0.004 * np.exp(-0.25)), rel=1e-15)


@pytest.mark.parametrize(
    ("points", "message"),
    [
        ([[0, 0, 0]], "two points"),
        ([[0, 0], [1, 0]], "three coordinates"),
        ([[0, 0, 0], [1, 0, 0], [1, 0, 0]], "segment 2 of the path has no length"),
        ([[0, 0, 0], [np.nan, 0, 0]], "segment 1 of the path has no length"),
    ],
)
def test_impossible_paths(points, message):
    with pytest.raises(ValueError, match=message):
        bs.chain(points)


def test_legs_must_fit():
    with pytest.raises(ValueError, match="4 segments need 4 leg numbers"):
        bs.chain(BENT, legs=[0, 1])


@pytest.mark.parametrize("cutoff", [0.0, -1.0, np.nan, np.inf])
def test_a_wire_needs_a_cut_off(cutoff):
    with pytest.raises(ValueError, match="cut-off above zero"):
        bs.forces(bs.chain(BENT), cutoff)


def test_arcs():
    quarter = bs.arc_points([1, 1, 0], [2, 1, 0], [0, 0, 2], np.pi / 2, 10)
    np.testing.assert_allclose(quarter[-1], [1, 2, 0], atol=1e-15)
    np.testing.assert_allclose(np.linalg.norm(quarter - [1, 1, 0], axis=1), 1, rtol=1e-15)
    helix = bs.arc_points([0, 0, 0], [1, 0, 0.5], [0, 0, 1], 4 * np.pi, 8, rise=2.0)
    np.testing.assert_allclose(helix[-1], [1, 0, 2.5], atol=1e-14)


def test_distances():
    path = bs.chain([[0, 0, 0], [1, 0, 0], [1, 1, 0], [0.5, 1, 0], [0.5, -1, 0.1], [0.5, -1, 3]])
    got = bs.distances(path)
    np.testing.assert_allclose(got, got.T, atol=1e-15)
    assert got[0, 1] == got[1, 2] == 0
    assert got[0, 2] == pytest.approx(1)
    assert 0.04 < got[0, 3] < 0.05  # passes over it, at half the height
    # against a search
    s = np.linspace(0, 1, 201)
    on = path.start[:, None] + s[:, None] * (path.end - path.start)[:, None]
    apart = np.linalg.norm(on[:, None, :, None] - on[None, :, None, :], axis=-1).min(axis=(2, 3))
    assert (got <= apart + 1e-12).all()
    np.testing.assert_allclose(got, apart, atol=0.011)
    parallel = bs.beside(bs.chain([[0, 0, 0], [1, 0, 0]]), bs.chain([[3, 0.5, 0], [2, 0.5, 0]]))
    assert bs.distances(parallel)[0, 1] == pytest.approx(np.hypot(1, 0.5))


# -- forces ------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("cutoff", bs.cutoffs(0.01))
def test_no_force_of_a_closed_wire_on_itself(cutoff):
    path = bs.chain(BENT, closed=True)
    loads = bs.forces(path, cutoff, 1e10, about=[0.1, -2, 1])
    size = np.abs(loads.force).max()
    assert size > 1e3
    assert np.abs(loads.force.sum(axis=0)).max() < 1e-11 * size
    assert np.abs(loads.moment.sum(axis=0)).max() < 1e-10 * size


def test_an_open_wire_does_push_itself():
    # which is why a missing return must be stated
    assert np.abs(bs.forces(bs.chain(BENT), 0.01).force.sum(axis=0)).max() > 1e-9


def test_circuits_push_each_other_alike():
    one = bs.chain(BENT, closed=True)
    two = bs.chain(BENT[:4] * [1, -1, 1] + [0.2, -0.5, 0.3], closed=True, share=-0.4)
    both = bs.beside(one, two)
    assert both.leg.tolist() == list(range(9))
    assert both.wire.tolist() == [0] * 5 + [1] * 4
    alone = [bs.forces(w, 0.01).force for w in (one, two)]
    extra = bs.forces(both, 0.01).force - np.concatenate(alone)
    np.testing.assert_allclose(extra[:5].sum(axis=0), -extra[5:].sum(axis=0), rtol=1e-9, atol=1e-16)
    assert np.abs(extra[:5].sum(axis=0)).max() > 1e-9


@pytest.mark.parametrize("corner", [1, 2, 3])
@pytest.mark.parametrize("axis", [0, 1, 2])
def test_force_is_half_the_gradient_of_the_inductance(corner, axis):
    # Two neighbouring legs turn about their far ends: the work is that of their loads, weighted by the way moved.
    def stretched(step):
        p = BENT.copy()
        p[corner, axis] += step
        return bs.inductance(bs.chain(p, closed=True), 0.01)

    h = 1e-4
    gradient = (stretched(h) - stretched(-h)) / (2 * h)
    path = bs.chain(BENT, closed=True)
    work = 0.0
    for leg, pivot in ((corner - 1, BENT[corner - 1]), (corner, BENT[corner + 1])):
        loads = bs.forces(path, 0.01, about=pivot)
        d = BENT[corner] - pivot
        # a moment M about the pivot and a motion e of the far end: M·(d × e)/d²
        turn = np.cross(d, np.eye(3)[axis]) / (d @ d)
        work += loads.moment[leg] @ turn
    assert work == pytest.approx(gradient / 2, rel=2e-6, abs=1e-12)


def test_moments_move_with_their_point():
    path, shift = bs.chain(BENT, closed=True), np.array([0.3, -0.7, 2.0])
    here, there = bs.forces(path, 0.01), bs.forces(path, 0.01, about=shift)
    np.testing.assert_allclose(there.force, here.force, rtol=1e-14)
    np.testing.assert_allclose(there.moment, here.moment - np.cross(shift, here.force), atol=1e-20)


def test_a_leg_cut_in_two_carries_the_same():
    whole = bs.chain(BENT, closed=True)
    middle = (BENT[0] + BENT[1]) / 2
    cut = bs.chain(np.insert(BENT, 1, middle, axis=0), closed=True, legs=[0, 0, 1, 2, 3, 4])
    one, two = bs.forces(whole, 0.01), bs.by_leg(bs.forces(cut, 0.01), cut)
    np.testing.assert_allclose(two.force, one.force, rtol=1e-10, atol=1e-18)
    np.testing.assert_allclose(two.moment, one.moment, rtol=1e-10, atol=1e-18)


def test_impulse_is_the_force_of_the_specific_energy():
    path = bs.chain(BENT, closed=True)
    np.testing.assert_allclose(
        bs.forces(path, 0.01, 2.5e6).force, 2.5e6 * bs.forces(path, 0.01).force, rtol=1e-13
    )


def test_long_parallel_wires():
    pair = bs.beside(
        bs.chain([[-500, 0, 0], [500, 0, 0]], share=0.25),
        bs.chain([[-500, 0.1, 0], [500, 0.1, 0]], share=0.75),
    )
    expected = magnetics.PARALLEL_PER_LENGTH(i2=0.25 * 0.75 * 1e10, d=0.1)
    middle = bs.force_per_length([0, 0.1, 0], [1, 0, 0], bs.chain([[-500, 0, 0], [500, 0, 0]], 0.25), i2=1e10)
    assert -0.75 * middle[1] == pytest.approx(expected, rel=1e-7)
    loads = bs.forces(pair, 0.004, 1e10).force
    assert loads[0, 1] == pytest.approx(1000 * expected, rel=2e-4)  # like currents attract
    np.testing.assert_allclose(loads[0], -loads[1], rtol=1e-9, atol=1e-6)


def test_midpoint_form_of_a_fine_loop():
    path = bs.chain(knot(6000), closed=True, legs=np.zeros(6000))
    coarse = bs.chain(knot(120), closed=True)
    cutoff = 0.01
    fast = bs.midpoint_forces(path, cutoff, about=[1, 2, 3])
    # over each fiftieth of the loop: the load per piece, against the full integrals on a coarser polygon
    pieces = fast.force.reshape(120, 50, 3).sum(axis=1)
    loads = bs.forces(coarse, cutoff, about=[1, 2, 3])
    assert np.abs(pieces - loads.force).max() < 0.03 * np.abs(loads.force).max()
    assert np.abs(fast.force.sum(axis=0)).max() < 1e-4 * np.abs(loads.force).sum()
    assert np.abs(fast.moment.sum(axis=0)).max() < 1e-3 * np.abs(loads.moment).sum()
