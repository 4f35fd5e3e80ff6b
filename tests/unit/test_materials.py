"""Constant sets are never mixed, and what a set lacks is named."""

import pytest

from strikeenergy.errors import DataError, MissingInput, UnknownName
from strikeenergy.materials import DEFAULT_SET, PROPERTIES, Materials, material_names, own_material, sets
from strikeenergy.sources import Source, Standing, source, sources, weakest
from strikeenergy.tables import constant, read_table, standing
from strikeenergy.units import scale

KNOWN = Materials()


def test_default_set_comes_first():
    assert next(iter(sets())) == DEFAULT_SET == "IEC 62305-1 Annex D"


@pytest.mark.parametrize("name", material_names())
def test_every_material_is_reachable(name):
    assert KNOWN.canonical(name.upper()) == name
    for chosen in sets():
        material = KNOWN.get(name, chosen)
        for value in material.properties.values():
            assert value.source.citation
            assert value.value > 0


def test_one_calculation_uses_one_set():
    for chosen, known in sets().items():
        for row in known.materials.values():
            keys = {value.source.key for value in row.values()}
            assert len(keys) <= 2, chosen  # IEC 60949's own constants are printed in IEC 60364-5-54


def test_physical_order():
    for known in sets().values():
        for row in known.materials.values():
            assert 1e-9 < row["resistivity"].value < 1e-5
            assert 0 < row["temperature_coefficient"].value < 0.01
            if "melting_temperature" in row:
                assert row["melting_temperature"].value > 400
            if "density" in row:
                assert 2000 < row["density"].value < 23000


def test_what_a_set_lacks_is_named():
    with pytest.raises(MissingInput, match="no latent heat of melting"):
        _ = KNOWN.get("stainless steel")["latent_heat"]
    with pytest.raises(MissingInput, match="choose constants = 'IEEE 80'"):
        _ = KNOWN.get("aluminium alloy")["resistivity"]
    with pytest.raises(MissingInput, match="has no titanium"):
        _ = KNOWN.get("titanium")["resistivity"]


def test_stand_ins_say_so():
    zinc = KNOWN.get("galvanised steel")
    assert zinc["resistivity"].value == KNOWN.get("mild steel")["resistivity"].value
    assert "zinc layer is left out" in zinc.remarks[0]
    assert "row" in KNOWN.get("copper", "IEEE 80").remarks[0]
    assert KNOWN.get("tin-plated copper", "IEEE 80").remarks[0].startswith("the tin layer")


def test_families_of_the_limit_tables():
    assert KNOWN.family("tin-plated copper") == "copper"
    assert KNOWN.family("copper, hard-drawn") is None
    assert KNOWN.family("steel 1020") == "mild steel"
    assert Materials({"x": {}}, {"x": "aluminium alloy"}).family("x") == "aluminium alloy"


def test_unknown_names():
    with pytest.raises(UnknownName, match="did you mean 'aluminium'"):
        KNOWN.canonical("alumnium")
    with pytest.raises(UnknownName, match="IEC 60949"):
        KNOWN.get("copper", "IEC 60494")


def test_own_material():
    given = {
        "resistivity": ("30 nohm*m", Source("own", "certificate"), Standing.GIVEN),
        "inverse_coefficient": ("230 K", Source("own", "certificate"), Standing.GIVEN),
    }
    own = own_material("x", given)
    assert own["resistivity"].value == pytest.approx(30e-9)
    assert own["temperature_coefficient"].value == pytest.approx(1 / 250)
    assert own["reference_temperature"].standing is Standing.ASSUMED
    known = Materials(own={"x": own})
    assert known.get("x").remarks == ()
    assert known.get("x", "IEC 60949").remarks == (
        "the constants of x are the case's own; the set 'IEC 60949' is not used",
    )


def test_properties_have_units():
    for unit, meaning in PROPERTIES.values():
        assert scale(unit)
        assert meaning


def test_standings_are_ordered():
    assert weakest([Standing.PUBLISHED, Standing.ASSUMED, Standing.MEMORY_HIGH]) is Standing.ASSUMED
    assert weakest([]) is Standing.DERIVED
    assert standing("published") is Standing.PUBLISHED
    with pytest.raises(DataError, match="unknown standing"):
        standing("rumour")


def test_sources():
    assert str(source("ieee80", "Table 1")).endswith("Table 1")
    assert all(s.citation for s in sources().values())
    with pytest.raises(UnknownName):
        source("nobody")


@pytest.mark.parametrize(
    ("entry", "said"),
    [
        ({"value": "5 kg"}, "a length"),
        ({}, "'value' is missing"),
        ({"value": "5 m", "source": "nobody"}, "unknown source"),
        ({"value": "5 m", "standing": "rumour"}, "unknown standing"),
        ("5", "no unit"),
    ],
)
def test_a_damaged_table_does_not_load(entry, said):
    defaults = {"source": "ieee80", "standing": "published"}
    with pytest.raises(DataError, match=said):
        constant(entry, "m", meaning="length", defaults=defaults)


def test_a_number_without_a_source_does_not_load():
    with pytest.raises(DataError, match="'source' is missing"):
        constant("5 m", "m", defaults={"standing": "published"})


def test_missing_table():
    with pytest.raises(DataError, match=r"nothing\.toml"):
        read_table("strikeenergy", "data", "nothing.toml")
