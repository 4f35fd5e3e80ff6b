"""A sweep of strokes through the skin effect, against the loops of scipy's stiff solvers that one would write instead.

The peers solve the same equations on the same grid (`solve_ivp`, BDF with its sparsity and LSODA with its band, in two
pieces, because one piece steps over the front), at tolerances that give the same error. Each ratio is that of two CPU times of one run;
the loops are timed on a few strokes and scaled.
"""

import time

import numpy as np
import pytest
from scipy.integrate import solve_ivp
from scipy.sparse import diags

from strikeenergy.physics import pulses
from strikeenergy.physics.skin import MU0, skin_heating
from strikeenergy.physics.skin_grid import first_cell, radial_faces, surface_weights

STROKES = 128
SAMPLE = (5, 70)
RNG = np.random.default_rng(3)
PEAK = RNG.uniform(20e3, 200e3, STROKES)
TAU1 = np.exp(RNG.uniform(np.log(1e-6), np.log(19e-6), STROKES))
TAU2 = RNG.uniform(150e-6, 485e-6, STROKES)
SCALE = pulses.heidler_correction(TAU1, TAU2, 10.0)
RADIUS, RHO0, ALPHA, C, K = np.sqrt(50e-6 / np.pi), 17.8e-9, 3.92e-3, 8920 * 385, 390.0


def sweep(refine=1.0, chosen=slice(None)):
    peak, tau1, tau2, k = PEAK[chosen], TAU1[chosen], TAU2[chosen], SCALE[chosen]
    return skin_heating(
        lambda t: pulses.heidler_current(t, peak, tau1, tau2, 10.0, k),
        radius=RADIUS,
        front=tau1,
        tail=tau2,
        resistivity=RHO0,
        coefficient=ALPHA,
        heat_capacity=C,
        conductivity=K,
        refine=refine,
        estimate_error=False,
    )


class Peer:
    """One stroke as a system of ordinary differential equations; y holds rise and u of each cell by turns."""

    def __init__(self, j):
        faces = radial_faces(0.0, RADIUS, float(first_cell(RHO0, TAU1[j], 1.0, K / C, TAU2[j])), 1.0)
        self.j, self.n = j, len(faces) - 1
        self.area = np.diff(faces**2) / 2
        c = np.sqrt((faces[1:] ** 2 + faces[:-1] ** 2) / 2)
        self.mass = MU0 * np.log(c[1:] / c[:-1])
        self.flow = K * faces[1:-1] / np.diff(c)
        self.weights = surface_weights(self.area)
        self.u, self.q = np.zeros(self.n + 1), np.zeros(self.n + 1)
        # the same Heidler function, in the cheap form that floats allow
        self.shape = PEAK[j] / SCALE[j] / (2 * np.pi), TAU1[j], TAU2[j]

    def slope(self, t, y):
        top, tau1, tau2 = self.shape
        x = (t / tau1) ** 10
        u, q = self.u, self.q
        u[1:-1], u[-1] = y[1:-1:2], top * x / (1 + x) * np.exp(-t / tau2)
        rise = y[::2]
        density = np.diff(u) / self.area
        field = RHO0 * (1 + ALPHA * rise) * density
        q[1:-1] = self.flow * np.diff(rise)
        out = np.empty_like(y)
        out[::2] = (field * density + np.diff(q) / self.area) / C
        out[1:-1:2] = np.diff(field) / self.mass
        out[-1] = 0.0
        return out

    def solve(self, method, rtol):
        tau1, tau2 = self.shape[1:]
        size = 2 * self.n
        if method == "LSODA":
            extra = {"lband": 2, "uband": 2}
        else:
            extra = {"jac_sparsity": diags([1.0] * 5, range(-2, 3), shape=(size, size), format="csc")}
        # u is of the order of 1e4 A/rad, the rise of 1 to 100 K
        atol = np.tile([rtol, rtol * 1e3], self.n)
        y, highest = np.zeros(size), 0.0
        for piece in ((0.0, 3 * tau1), (3 * tau1, 5 * tau2)):
            done = solve_ivp(self.slope, piece, y, method=method, rtol=rtol, atol=atol, **extra)
            assert done.success
            y = done.y[:, -1]
            highest = max(highest, (self.weights @ done.y[::2][-3:]).max())
        return highest


def seconds(work, repeats):
    """Least CPU time, and what the work gave."""
    times = []
    for _ in range(repeats):
        start = time.process_time()
        given = work()
        times.append(time.process_time() - start)
    return min(times), given


@pytest.mark.benchmark
def test_a_sweep_against_loops_of_stiff_solvers():
    sweep()  # imports
    fine = sweep(4.0, list(SAMPLE)).surface_rise
    per_stroke, ours = seconds(sweep, 3)
    per_stroke /= STROKES
    our_error = np.abs(ours.surface_rise[list(SAMPLE)] / fine - 1).max()
    report = [f"\nskin effect: {per_stroke * 1e3:.2f} ms a stroke, error {our_error:.1e}"]
    ratios = {}
    for method, rtol in (("BDF", 1e-3), ("LSODA", 1e-3)):
        loop, found = seconds(lambda m=method, r=rtol: [Peer(j).solve(m, r) for j in SAMPLE], 2)
        error = np.abs(np.array(found) / fine - 1).max()
        ratios[method] = loop / len(SAMPLE) / per_stroke
        report.append(f"{method} {ratios[method]:.1f} times that, error {error:.1e}")
        # It solves the same thing as well as we do, and is not asked for more.
        assert error <= 2.5e-3
    print("; ".join(report))
    assert our_error <= 2.5e-3
    assert ratios["BDF"] >= 12
    assert ratios["LSODA"] >= 5
