"""The energy of a flash and of its channel, as published.

Sources (each number with its own): T. C. Marshall, M. Stolzenburg, J. Geophys. Res. 106 (2001) 4757; M. A. Pasek,
M. Hurst, Scientific Reports 6 (2016) 30586; B. N. Turman, J. Geophys. Res. 82 (1977) 2566; the schools of energy per metre
(Krider et al. 1968, Plooster 1971, Hill 1977, Paxton et al. 1986, Dubovoy et al. 1991, Borovsky 1998, Jayakumar et al.
2006), all of which are recalled from memory. The numbers are typed here a second time. Lengths and shares are computed
values, at the digits to which they are printed. Facts of the trade are common practice and have no source.
"""

from __future__ import annotations

import pytest

from strikeenergy.lightning.ledger import Entry, build_ledger, practice, published
from strikeenergy.physics import adiabatic, channel
from strikeenergy.sources import Standing

SEEN, HIGH, MEDIUM = Standing.PUBLISHED, Standing.MEMORY_HIGH, Standing.MEMORY_MEDIUM

# quantity, source key, low, high, standing
STATED = [
    ("total", "marshall2001", 1e7, 1e10, SEEN),
    ("total", "pasek2016", None, 1e9, SEEN),
    ("total", "noaa-quoted", 1e8, 3e10, SEEN),
    ("typical_total", "noaa-quoted", 1e9, 5e9, SEEN),
    ("radiated", "turman1977", 1e9, None, SEEN),
    ("radiated", "cooray2020radiated", 3e4, 7e4, SEEN),
    ("voltage", "marshall2001", 20e6, 130e6, SEEN),
    ("voltage", "marshall2001", -102e6, 94e6, SEEN),
    ("per_metre", "krider1968", 2.3e5, 2.3e5, HIGH),
    ("per_metre", "plooster1971", 2.4e3, 2.4e3, MEDIUM),
    ("per_metre", "hill1977", 1.5e4, 1.5e4, MEDIUM),
    ("per_metre", "paxton1986", 4e3, 4e3, MEDIUM),
    ("per_metre", "dubovoy1991", 3e3, 3e3, MEDIUM),
    ("per_metre", "borovsky1998", 2e2, 1e4, MEDIUM),
    ("per_metre", "jayakumar2006", 1e3, 1e4, MEDIUM),
    ("per_metre_in_sand", "pasek2016", 1.0e6, 1.0e6, SEEN),
    ("temperature", "saha-boltzmann", 21370, 26500, SEEN),
    ("temperature", "srep33906", 6140.8, 10424, SEEN),
    ("temperature", "orville1968", 28000, 31000, HIGH),
    ("dimension", "lightning-fractal", 1.34, 1.34, SEEN),
    ("dimension", "lightning-fractal", 1.37, 1.37, SEEN),
    ("dimension", "engineering", 1.05, 1.15, Standing.MEMORY_LOW),
    ("tortuosity", "cooray2018", 0.27925, 0.29671, MEDIUM),
    ("cloud_base", "cloud-pages", 300, 1500, SEEN),
    ("cloud_base", "cloud-pages", 600, 1500, SEEN),
    ("cloud_base", "cloud-pages", None, 600, SEEN),
    ("cloud_base", "cloud-pages", 900, 900, SEEN),
    ("cloud_base", "cloud-pages", 2000, None, SEEN),
    ("charge_height", "cooray2020", 8000, 9000, SEEN),
    ("charge_height", "rakov2003", 5000, 7000, MEDIUM),
]
PRACTICE = {
    "cloud_height": (2e3, 4e3, "m"),
    "dimension": (1.3, 1.4, "1"),
    "duration": (0.1, 0.1, "s"),
    "temperature": (30273.15, 30273.15, "K"),
    "total": (1.1e9, 1.1e9, "J"),
}

# dimension, then the length in km of a channel of 3 km height, by ruler, as printed
RULERS = (500, 100, 50, 10, 1)
LENGTHS = {
    1.05: ("3.28", "3.56", "3.68", "3.99", "4.48"),
    1.10: ("3.59", "4.22", "4.52", "5.31", "6.68"),
    1.20: ("4.29", "5.92", "6.80", "9.39", "14.9"),
    1.30: ("5.14", "8.32", "10.2", "16.6", "33.1"),
    1.34: ("5.52", "9.54", "12.1", "20.9", "45.6"),
    1.40: ("6.14", "11.7", "15.4", "29.4", "73.8"),
}

# resistance (ohm), energies at 55 kJ/ohm, 650 kJ/ohm, 2.5 MJ/ohm, 10 MJ/ohm, relative tolerance of the print, share
ACTIONS = (55e3, 650e3, 2.5e6, 10e6)
COPPER, STEEL = 1.724e-8, 1.2e-7
SHARES = {
    "copper 50 mm2, 20 m": ((COPPER, 50e-6, 20), 6.896e-3, (379, 4.48e3, 17.2e3, 69.0e3), "6.3e-5"),
    "steel 50 mm2, 20 m": ((STEEL, 50e-6, 20), 48e-3, (2.64e3, 31.2e3, 120e3, 480e3), "4.4e-4"),
    "copper 16 mm2, 10 m": ((COPPER, 16e-6, 10), 10.8e-3, (593, 7.0e3, 26.9e3, 108e3), "9.8e-5"),
    "joint": (None, 1e-3, (55, 650, 2.5e3, 10e3), "9.1e-6"),
    "earth electrode": (None, 10.0, (0.55e6, 6.5e6, 25e6, 100e6), "9.1e-2"),
}


@pytest.mark.parametrize("quantity", sorted({row[0] for row in STATED}))
def test_the_data_file_holds_the_published_numbers(quantity):
    due = [row[1:] for row in STATED if row[0] == quantity]
    held = published(quantity)
    assert [(s.source.key, s.standing) for s in held] == [(row[0], row[3]) for row in due]
    for stated, (_, low, high, _) in zip(held, due, strict=True):
        for end, value in ((stated.low, low), (stated.high, high)):
            assert end is None if value is None else end == pytest.approx(value, rel=2e-5)
        assert stated.source.citation
        assert stated.source.locator
        assert stated.school


@pytest.mark.parametrize("fact", sorted(PRACTICE))
def test_facts_of_the_trade_are_common_practice_without_a_source(fact):
    held = practice(fact)
    low, high, unit = PRACTICE[fact]
    assert (held.low, held.high, held.unit) == (pytest.approx(low), pytest.approx(high), unit)
    assert held.standing is Standing.PRACTICE
    assert str(held.standing) == "common practice, no source"
    assert held.source.key == "common-practice"
    assert "without a publication" in held.source.citation


@pytest.mark.parametrize(("height", "ruler", "dimension"), [(3e3, 50, 1.1), (2e3, 50, 1.05), (4e3, 10, 1.4)])
def test_the_published_range_contains_the_total_of_the_trade(height, ruler, dimension):
    # 1.1e9 J is common practice and has no source: it is checked against the range and never part of it.
    ledger = build_ledger([], height, ruler, dimension)
    assert ledger.low <= 1.1e9 <= ledger.high
    assert practice("total").standing is Standing.PRACTICE
    assert practice("total") not in ledger.totals


def test_the_range_is_the_union_of_totals_and_of_energy_per_metre_times_length():
    ledger = build_ledger([])
    assert ledger.length == pytest.approx(4518, abs=1)
    assert (ledger.per_metre_low, ledger.per_metre_high) == (2e2, 2.3e5)
    assert ledger.low == pytest.approx(2e2 * ledger.length, rel=1e-12)
    assert ledger.high == 3e10
    # The school of optical scaling, times the length, comes near the trade's total by itself.
    assert 2.3e5 * ledger.length == pytest.approx(1.04e9, rel=5e-3)


@pytest.mark.parametrize("dimension", LENGTHS)
def test_table_of_lengths(dimension):
    for ruler, printed in zip(RULERS, LENGTHS[dimension], strict=True):
        half = 0.5 * 10.0 ** -len(printed.partition(".")[2])
        length = channel.LENGTH(H=3e3, eps=ruler, D=dimension)
        assert length / 1e3 == pytest.approx(float(printed), abs=half * 1.001)


def test_what_the_dimensions_mean_for_the_main_path():
    ratio = {
        (d, eps): channel.LENGTH(H=3e3, eps=eps, D=d) / 3e3 for d in (1.05, 1.15, 1.34) for eps in (50, 1)
    }
    assert ratio[1.05, 50] == pytest.approx(1.227, abs=5e-4)
    assert ratio[1.15, 50] == pytest.approx(1.848, abs=5e-4)
    assert ratio[1.34, 1] > 15  # absurd: the dimension of the branched pattern on the main path


@pytest.mark.parametrize("name", SHARES)
def test_energies_and_shares_of_objects(name):
    wire, resistance, energies, share = SHARES[name]
    exact = resistance
    if wire is not None:
        rho, section, length = wire
        exact = adiabatic.RESISTANCE(rho0=rho, l=length, q=section)
        assert exact == pytest.approx(resistance, rel=3e-3)
    for action, energy in zip(ACTIONS, energies, strict=True):
        assert exact * action == pytest.approx(energy, rel=3e-3)
    got = channel.SHARE(E=exact * ACTIONS[-1], E_f=practice("total").high)
    assert f"{got:.1e}" == f"{float(share):.1e}"
    # Against the published range the share is a range, which encloses that of the trade's total.
    energy = exact * ACTIONS[-1]
    ledger = build_ledger([Entry(name, "ohmic", energy, energy, energy)])
    low, high = ledger.share(ledger.entries[0])
    assert low < got < high


def test_conductors_take_very_little_and_ohms_take_per_cents():
    taken = [e / 1.1e9 for name in list(SHARES)[:4] for e in SHARES[name][2]]
    assert 1e-8 < min(taken) < max(taken) < 1e-3
    assert SHARES["earth electrode"][2][-1] / 1.1e9 == pytest.approx(0.09, abs=5e-3)


def test_a_fulgurite_would_need_eighteen_ohms_a_metre():
    (sand,) = published("per_metre_in_sand")
    assert sand.high / 55e3 == pytest.approx(18, abs=0.5)
    assert sand not in published("per_metre")


def test_charge_times_voltage_lies_within_the_energy_said_to_be_available():
    difference, total = published("voltage")[0], published("total")[0]
    for volts in (difference.low, difference.high):
        for charge in (1.3, 7.5, 40):  # negative flash, 95 %, 50 %, 5 %: IEC 62305-1:2010 Table A.1
            assert total.low < channel.ENERGY_DISCHARGED(Q=charge, V=volts) < total.high
            assert channel.ENERGY_FALLEN(Q=charge, V=volts) == 2 * channel.ENERGY_DISCHARGED(
                Q=charge, V=volts
            )
