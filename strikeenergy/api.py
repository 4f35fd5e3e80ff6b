"""Exactly what a plugin author may import.

A plugin imports from here, from ``strikeenergy.physics`` and from third-party libraries, and from nowhere else.
"""

from __future__ import annotations

from strikeenergy.errors import MissingInput, OutsideValidity, Problem, QuantityError
from strikeenergy.formatting import format_quantity
from strikeenergy.inputs import MaterialName, OfMaterial, Part, StruckObject, Unit
from strikeenergy.lightning.flash import Flash, Stroke
from strikeenergy.materials import Material
from strikeenergy.note import Formula, Given, Note
from strikeenergy.plugin import (
    API_VERSION,
    Bracket,
    Criterion,
    Effect,
    Finding,
    Findings,
    Later,
    Value,
    Words,
    effect,
    hookimpl,
)
from strikeenergy.sources import Constant, Source, Standing, source
from strikeenergy.tables import constant, data_file, read_table
from strikeenergy.units import Quantity, awg_number, awg_section

__all__ = [
    "API_VERSION",
    "Bracket",
    "Constant",
    "Criterion",
    "Effect",
    "Finding",
    "Findings",
    "Flash",
    "Formula",
    "Given",
    "Later",
    "Material",
    "MaterialName",
    "MissingInput",
    "Note",
    "OfMaterial",
    "OutsideValidity",
    "Part",
    "Problem",
    "Quantity",
    "QuantityError",
    "Source",
    "Standing",
    "Stroke",
    "StruckObject",
    "Unit",
    "Value",
    "Words",
    "awg_number",
    "awg_section",
    "constant",
    "data_file",
    "effect",
    "format_quantity",
    "hookimpl",
    "read_table",
    "source",
]
