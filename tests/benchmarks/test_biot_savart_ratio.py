"""Field of 4000 segments on their 4000 midpoints, against the textbook form that one would write with numpy.

The ratio is that of two CPU times of one run; the textbook loop is timed on a sample of the points and scaled.
"""

import time

import numpy as np
import pytest

from strikeenergy.physics import biot_savart as bs

N = 4000


def seconds(work, repeats):
    """Least CPU time: the run that others disturbed least."""
    times = []
    for _ in range(repeats):
        start = time.process_time()
        work()
        times.append(time.process_time() - start)
    return min(times)


@pytest.mark.benchmark
def test_field_of_a_coil():
    t = np.arange(N) * 2 * np.pi / N
    r = 1 + 0.3 * np.cos(20 * t)
    path = bs.chain(np.stack([r * np.cos(t), r * np.sin(t), 0.3 * np.sin(20 * t)], axis=1), closed=True)
    middle = (path.start + path.end) / 2
    sample = np.arange(0, N, 4)

    def textbook():
        out = np.empty((len(sample), 3))
        for row, k in enumerate(sample):
            r1, r2 = middle[k] - path.start, middle[k] - path.end
            n1, n2 = np.linalg.norm(r1, axis=1), np.linalg.norm(r2, axis=1)
            below = n1 * n2 * (n1 * n2 + np.einsum("ij,ij->i", r1, r2))
            below[k] = np.inf  # a segment makes no field on itself
            factor = 1e-7 * path.share * (n1 + n2) / below
            out[row] = (factor[:, None] * np.cross(r1, r2)).sum(axis=0)
        return out

    def ours():
        return bs.field_fast(middle, path)

    ours()  # imports, once a process
    per_pair = seconds(textbook, 2) / (len(sample) * N)
    fast = seconds(ours, 5) / N**2
    reference = textbook()
    difference = np.abs(ours()[sample] - reference).max() / np.abs(reference).max()
    ratio = per_pair / fast
    print(
        f"\nBiot-Savart: {fast * 1e9:.1f} ns a pair, {ratio:.1f} times the textbook form, within {difference:.1e}"
    )
    assert difference <= 1e-9
    assert ratio >= 10
