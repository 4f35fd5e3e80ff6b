"""What holds for every ledger and every channel."""

from __future__ import annotations

import json

import pytest
from hypothesis import given
from hypothesis import strategies as st

from strikeenergy.lightning.ledger import Entry, build_ledger, practice, published
from strikeenergy.physics import channel

heights = st.floats(1.0, 2e4)
fractions = st.floats(1e-4, 1.0)
dimensions = st.floats(1.0, 1.95)
names = st.text(min_size=1, max_size=200).filter(
    lambda t: any(c.isprintable() and not c.isspace() for c in t)
)


@st.composite
def entries(draw):
    joules = st.just(0.0) | st.floats(1e-9, 1e14)
    low, energy, high = sorted(draw(joules) for _ in range(3))
    return Entry(draw(names), draw(st.sampled_from(["ohmic", "arc root", "channel"])), energy, low, high)


@given(heights, fractions, dimensions)
def test_a_channel_is_no_shorter_than_its_height_and_grows_as_the_ruler_shrinks(height, part, dimension):
    ruler = part * height
    length = channel.LENGTH(H=height, eps=ruler, D=dimension)
    assert length >= height * (1 - 1e-12)
    assert channel.LENGTH(H=height, eps=ruler / 2, D=dimension) >= length
    assert channel.LENGTH(H=height, eps=ruler, D=dimension + 0.04) >= length
    # Half the ruler measures 2^(D − 1) of the length: the definition of the dimension.
    halved = channel.LENGTH(H=height, eps=ruler / 2, D=dimension)
    assert halved / length == pytest.approx(2 ** (dimension - 1), rel=1e-9)


@given(heights, fractions, dimensions, st.floats(1e-3, 1e3))
def test_a_channel_scales_with_its_ruler(height, part, dimension, scale):
    length = channel.LENGTH(H=height, eps=part * height, D=dimension)
    scaled = channel.LENGTH(H=scale * height, eps=scale * part * height, D=dimension)
    assert scaled == pytest.approx(scale * length, rel=1e-9)


@given(st.lists(entries(), max_size=4), heights, fractions, dimensions)
def test_every_ledger_closes(rows, height, part, dimension):
    ledger = build_ledger(rows, height, part * height, dimension)
    assert 0 < ledger.low < ledger.high
    assert ledger.low <= practice("total").high <= ledger.high
    for stated in published("total"):
        for end in (stated.low, stated.high):
            assert end is None or ledger.low <= end <= ledger.high
    for stated in published("per_metre"):
        assert ledger.low * (1 - 1e-12) <= stated.low * ledger.length
        assert stated.high * ledger.length <= ledger.high * (1 + 1e-12)
    for entry in ledger.entries:
        low, high = ledger.share(entry)
        assert 0 <= low <= high <= 1
        assert low * ledger.high <= entry.low * (1 + 1e-12)
        assert high == 1 or high * ledger.low == pytest.approx(entry.high, rel=1e-12)


@given(st.lists(entries(), max_size=4), heights, fractions, dimensions)
def test_every_ledger_can_be_written(rows, height, part, dimension):
    ledger = build_ledger(rows, height, part * height, dimension)
    lines = ledger.lines()
    assert all(0 < len(line) <= 80 and line.isprintable() for line in lines)
    text = json.dumps(ledger.to_dict(), sort_keys=True, allow_nan=False)
    assert json.dumps(json.loads(text), sort_keys=True) == text
    # A ledger made of its own entries is the same ledger.
    assert build_ledger(ledger.entries, ledger.height, ledger.ruler, ledger.dimension) == ledger


@given(st.floats(0, 1e6), st.floats(-1e9, 1e9))
def test_a_charge_in_its_own_field_gives_half(charge, volts):
    fallen = channel.ENERGY_FALLEN(Q=charge, V=volts)
    assert channel.ENERGY_DISCHARGED(Q=charge, V=volts) == fallen / 2
