"""The sheet: an upper bound that is called one, everywhere."""

import numpy as np
import pytest

from helpers import one, strokes
from strikeenergy import quantity
from strikeenergy.lightning.flash import Flash, Stroke
from strikeenergy_sheet import Sheet, melting, spreading


@pytest.mark.parametrize(
    ("material", "volume"), [("aluminium", 569.1), ("mild steel", 198.7), ("copper", 272.5)]
)
def test_energy_balance(material, volume):
    # 15 V and 100 C with the constants of IEC 62305-1:2010 Table D.2, from 20 °C
    result = one(
        kind="sheet", material=material, thickness="4 mm", drop="15 V", flash=strokes(charge="100 C")
    )
    found = result.findings["melted_volume_bound"]
    assert found.value * 1e9 == pytest.approx(volume, rel=1e-3)
    assert found.low is None
    assert found.bound == "upper bound"
    assert result.findings["root_energy"].value == 1500.0


def test_closure_with_the_heat_to_melt():
    # Volume times (density*(c*rise + latent heat)) is the energy that was put in.
    result = one(
        kind="sheet",
        material="copper",
        thickness="5 mm",
        drop="10 V",
        flash=strokes(charge="50 C"),
        start="40 degC",
    )
    heat = 8920 * (385 * (1080 - 40) + 209e3)
    assert result.findings["melted_volume_bound"].value * heat == pytest.approx(500.0, rel=1e-12)


def test_assumed_drop_is_shown_as_a_range():
    result = one(kind="sheet", material="aluminium", thickness="0.7 mm")
    found = result.findings["melted_volume_bound"]
    assert (found.low / found.value, found.high / found.value) == (
        pytest.approx(8 / 12),
        pytest.approx(16 / 12),
    )
    assert found.standing == "assumed"
    assert any("drop is assumed" in text for text in result.remarks)


def test_missing_latent_heat_is_named():
    result = one(kind="sheet", material="stainless steel", thickness="0.5 mm")
    assert "melted_volume_bound" not in result.findings
    assert any("no latent heat" in text for text in result.remarks)


@pytest.mark.parametrize(
    ("material", "thickness", "energy", "radius"),
    [("aluminium", 0.5, 2.5, 3.08), ("copper", 0.5, 2.5, 1.77), ("mild steel", 0.5, 10, 9.59), ("aluminium", 2, 10, 1.54), ("mild steel", 4, 2.5, 0.60)],
)  # fmt: skip
def test_spreading_current(material, thickness, energy, radius):
    # radial Joule heat alone, constants of IEC 62305-1:2010 Table D.2
    result = one(
        kind="sheet",
        material=material,
        thickness=f"{thickness} mm",
        flash=strokes(specific_energy=f"{energy} MJ/ohm"),
    )
    assert result.findings["spread_melt_radius"].value * 1e3 == pytest.approx(radius, abs=0.006)


def test_above_the_melting_point():
    result = one(kind="sheet", material="aluminium", thickness="1 mm", start="700 degC")
    assert not result.findings
    assert sum("no model covers it" in text for text in result.remarks) == 2


def test_set_with_volumetric_heat():
    result = one(kind="sheet", material="copper", constants="IEEE 80", thickness="1 mm")
    assert result.findings["spread_melt_radius"].value > 0


def test_arrays():
    sheet = Sheet(material="aluminium", thickness=quantity(np.array([0.5, 1.0]), "mm"))
    flash = Flash((Stroke(charge=np.array([50.0, 100.0]), specific_energy=1e6),))
    np.testing.assert_allclose(
        melting(sheet, flash).melted_volume_bound.value[1]
        / melting(sheet, flash).melted_volume_bound.value[0],
        2,
    )
    np.testing.assert_allclose(np.divide(*spreading(sheet, flash).spread_melt_radius), 2)
