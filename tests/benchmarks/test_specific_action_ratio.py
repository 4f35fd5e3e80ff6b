"""One million specific actions to temperatures, against numpy's copy of the same array."""

import statistics
import time

import numpy as np
import pytest

from strikeenergy.temperature_data import heating

COUNT = 1_000_000
TARGET = 80


def cost(work):
    begin = time.process_time()
    work()
    return time.process_time() - begin


@pytest.mark.benchmark
def test_a_million_temperatures(capsys):
    """Target: at most 80 copies. The ratio is the median of paired runs in one process."""
    table = heating("copper")
    g = np.random.default_rng(1).uniform(table.action[0], table.action[-1], COUNT)
    np.testing.assert_allclose(
        table.action_at(table.temperature_at(g[:1000])),
        np.where(on_plateau(table, g[:1000]), starts(table, g[:1000]), g[:1000]),
    )
    pairs = []
    for _ in range(15):
        ours = cost(lambda: table.temperature_at(g))
        copy = cost(lambda: [g.copy() for _ in range(20)]) / 20
        pairs.append(ours / copy)
    ratio = statistics.median(pairs)
    with capsys.disabled():
        print(f"\ninverse of G(T) for {COUNT} values: {ratio:.1f} times numpy's copy (target {TARGET})")
    assert ratio <= TARGET


def on_plateau(table, g):
    return np.any([(g > p.start) & (g <= p.end) for p in table.plateaus], axis=0)


def starts(table, g):
    return np.select(
        [(g > p.start) & (g <= p.end) for p in table.plateaus], [p.start for p in table.plateaus], 0.0
    )
