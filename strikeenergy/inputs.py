"""Declared inputs: one declaration serves case file, schema, help, reference text and validation.

A kind of struck object is a frozen pydantic model. Each quantity of it is ``Annotated[Quantity, Unit(...)]``: the unit, the
hard limits and the usual range stand in one place. Inside, every quantity is its SI number (or an array).
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass
from typing import Annotated, Any, ClassVar, get_args

import numpy as np
from pydantic import (
    BaseModel,
    ConfigDict,
    GetCoreSchemaHandler,
    GetJsonSchemaHandler,
    PrivateAttr,
    ValidationInfo,
    field_validator,
)
from pydantic.json_schema import JsonSchemaValue
from pydantic_core import CoreSchema, PydanticCustomError, core_schema

from strikeenergy.errors import InputError, Problem, close_matches
from strikeenergy.formatting import format_quantity, pretty
from strikeenergy.materials import DEFAULT_SET, Material, Materials, material_names, sets
from strikeenergy.units import Quantity, dimension_name, read, scale

__all__ = [
    "MaterialName",
    "OfMaterial",
    "Part",
    "SetName",
    "StruckObject",
    "Unit",
    "default_text",
    "parts_of",
    "summary_of",
    "unit_of",
    "words_of",
]


_FAR = 1e4


@dataclass(frozen=True)
class Unit:
    """The declaration of one input: its unit, its hard limits and its usual range, all in ``unit``.

    Args:
        unit: ``"mm**2"``; ``"degC"`` makes it a temperature (in kelvin inside), ``"K"`` a difference, ``""`` a plain number.
        gt, ge, lt, le: hard limits; beyond them the value is refused.
        typical: the range for tests and documentation. Not a limit; only what lies ten thousand times outside is refused.
        example: the text to show in messages and in a new case.
        wire: also take wire sizes such as ``"6 AWG"``.
    """

    unit: str
    gt: float | None = None
    ge: float | None = None
    lt: float | None = None
    le: float | None = None
    typical: tuple[float, float] | None = None
    example: str = ""
    wire: bool = False

    @property
    def text(self) -> str:
        """An example of what to write."""
        if self.example:
            return self.example
        middle = (self.typical[0] * self.typical[1]) ** 0.5 if self.typical and self.typical[0] > 0 else 1
        return f"{float(f'{middle:.2g}'):g} {self.unit}".strip()

    @property
    def range_text(self) -> str:
        """The hard limits in words."""
        parts = []
        for word, limit in (
            ("above", self.gt),
            ("at least", self.ge),
            ("below", self.lt),
            ("at most", self.le),
        ):
            if limit is not None:
                parts.append(f"{word} {limit:g} {pretty(self.unit)}".strip())
        return " and ".join(parts)

    def read(self, value: Any) -> Quantity:
        """Turn what the user wrote into an SI number or array within the limits.

        Raises:
            QuantityError, InputError: with what to write instead.
        """
        number = read(value, self.unit, example=self.text, wire=self.wire)
        self.check(number, value)
        return number

    def check(self, number: Quantity, shown: Any = None) -> None:
        """Hold a number against the limits.

        Raises:
            InputError: it is outside.
        """
        found = scale(self.unit)
        array = np.asarray(number)
        bad = np.zeros(array.shape, dtype=bool)
        for limit, outside in (
            (self.gt, np.less_equal),
            (self.ge, np.less),
            (self.lt, np.greater_equal),
            (self.le, np.greater),
        ):
            if limit is not None:
                bad |= outside(array, found.to_si(limit))
        far = self._far(array)
        if far.any() and not bad.any():
            low, high = (f"{end:g} {pretty(self.unit)}".strip() for end in self.typical or (0, 0))
            what = f"{shown!r}" if isinstance(shown, str) else f"{shown}"
            raise InputError([Problem(f"{what} is outside any physical range (usual are {low} to {high})", "check the number and its unit")])  # fmt: skip
        if bad.any():
            what = (
                f"{shown!r}"
                if isinstance(shown, str)
                else f"{int(bad.sum())} of {bad.size} values"
                if bad.ndim
                else f"{shown}"
            )
            raise InputError(
                [Problem(f"{what} must be {self.range_text}", f"write a value such as {self.text!r}")]
            )

    def _far(self, array: np.ndarray[Any, Any]) -> np.ndarray[Any, Any]:
        """Where a quantity that cannot be negative lies ten thousand times outside its usual range."""
        if self.typical is None or (self.gt != 0 and self.ge != 0):
            return np.zeros(array.shape, dtype=bool)
        found = scale(self.unit)
        low, high = (found.to_si(end) for end in self.typical)
        least = low / _FAR if self.gt == 0 else 0.0
        return np.asarray((array > high * _FAR) | ((array < least) & (array > 0)))

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        return core_schema.no_info_plain_validator_function(_as_custom_error(self.read))

    def __get_pydantic_json_schema__(
        self, schema: CoreSchema, handler: GetJsonSchemaHandler
    ) -> JsonSchemaValue:
        examples: dict[str, Any] = {"examples": [self.text], "x-unit": self.unit or "1"}
        limits = f", {self.range_text}" if self.range_text else ""
        examples["x-range"] = f"{dimension_name(self.unit)}{limits}"
        return {"type": "string" if self.unit else ["number", "string"], **examples}


def _as_custom_error(reader: Callable[[Any], Any]) -> Callable[[Any], Any]:
    """Let pydantic collect our own errors, wording untouched."""

    def run(value: Any) -> Any:
        try:
            return reader(value)
        except InputError as error:
            problem = error.problems[0]
            raise PydanticCustomError(
                "strikeenergy", "{what}", {"what": problem.what, "write": problem.write}
            ) from None

    return run


class _MaterialMark:
    """Names a material of the built-in sets or of the case."""

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        def check(value: Any, info: ValidationInfo) -> str:
            materials = (info.context or {}).get("materials") or Materials()
            if not isinstance(value, str):
                raise PydanticCustomError(
                    "strikeenergy",
                    "{what}",
                    {"what": f"{value!r} is no material", "write": "write a name such as 'copper'"},
                )
            return str(_as_custom_error(materials.canonical)(value))

        return core_schema.with_info_plain_validator_function(check)

    def __get_pydantic_json_schema__(
        self, schema: CoreSchema, handler: GetJsonSchemaHandler
    ) -> JsonSchemaValue:
        return {"type": "string", "examples": ["copper"], "x-names": material_names()}


class _SetMark:
    """Names a constant set."""

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        def check(value: Any) -> str:
            Materials().get("copper", value if isinstance(value, str) else str(value))
            return str(value)

        return core_schema.no_info_plain_validator_function(_as_custom_error(check))

    def __get_pydantic_json_schema__(
        self, schema: CoreSchema, handler: GetJsonSchemaHandler
    ) -> JsonSchemaValue:
        return {"type": "string", "enum": list(sets())}


MaterialName = Annotated[str, _MaterialMark()]
"""A field that names a material; unknown names are refused with the nearest ones."""

SetName = Annotated[str, _SetMark()]
"""A field that names a constant set."""


class Part(BaseModel):
    """A table inside an object, such as a neighbour or a bend. Frozen; unknown keys are refused."""

    model_config = ConfigDict(frozen=True, extra="forbid", strict=True, use_attribute_docstrings=True)


class StruckObject(Part):
    """What all struck objects share. A kind is a subclass with ``kind: Literal["..."] = "..."``.

    Inside an effect every declared quantity is its SI number (or an array), temperatures in kelvin.
    """

    kind: str
    """The kind of object."""
    name: str = ""
    """What the object is called in the report. Must be unique in the case."""
    use: str | None = None
    """What the part is for; selects the rows of the limit tables."""
    share: Annotated[Quantity, Unit("", gt=0, le=1, typical=(0.1, 1), example="0.5")] = 1.0
    """Fraction of the flash current that flows through the object. Specific energy scales with its square."""
    start: Annotated[Quantity, Unit("degC", gt=-273.15, typical=(-20, 60), example="20 degC")] = 293.15
    """Temperature before the stroke."""

    summary: ClassVar[str] = ""
    """One line for lists; by default the first line of the docstring."""
    uses: ClassVar[Mapping[str, str]] = {}
    """What ``use`` may be, each with what it means. Empty: any text."""
    example_fields: ClassVar[Mapping[str, Any]] = {}
    """What a new case of this kind sets (key to value)."""

    _materials: Materials = PrivateAttr(default_factory=Materials)

    @field_validator("use")
    @classmethod
    def _known_use(cls, value: str | None) -> str | None:
        if value is None or not cls.uses:
            return value
        folded = {_fold(name): name for name in cls.uses}
        if _fold(value) not in folded:
            raise PydanticCustomError(
                "strikeenergy",
                "{what}",
                {"what": f"unknown use {value!r}", "write": close_matches(value, cls.uses)},
            )
        return folded[_fold(value)]

    def model_post_init(self, context: Any, /) -> None:
        """Keep the materials of the case, and hold the object against its own rules."""
        if isinstance(context, dict) and context.get("materials") is not None:
            self._materials = context["materials"]
        problems = list(type(self).missing_or_extra(self.model_fields_set))
        problems += () if problems else self.check()
        if problems and not (isinstance(context, dict) and context.get("collect")):
            raise InputError(problems)

    @classmethod
    def missing_or_extra(cls, given: Iterable[str]) -> Iterable[Problem]:
        """Yield what is wrong with *which* fields are given (size given twice, or not at all). Override."""
        return ()

    def check(self) -> Iterable[Problem]:
        """Yield what is wrong with the values taken together. Override."""
        return ()

    def sizes(self) -> Mapping[str, Quantity]:
        """Return the sizes (SI) that limit tables may ask for: ``section``, ``diameter``, ``thickness``. Override."""
        return {}

    def facet(self, name: str) -> Any:
        """Return what a limit table selects its rows by: a field, or what follows from the fields. None: not known."""
        return getattr(self, name, None)

    @property
    def family(self) -> str | None:
        """The material whose rows of the limit tables apply, if the object is of one."""
        return None

    @property
    def is_array(self) -> bool:
        """Whether a field is an array."""
        return any(isinstance(value, np.ndarray) and value.ndim > 0 for _, value in self)


class OfMaterial(StruckObject):
    """A struck object that is made of one material, with constants from one named set."""

    material: MaterialName
    """What it is made of."""
    constants: SetName = DEFAULT_SET
    """The named set that all its constants come from."""

    @property
    def substance(self) -> Material:
        """The constants of its material."""
        return self._materials.get(self.material, self.constants)

    @property
    def family(self) -> str | None:
        """The material whose rows of the limit tables apply."""
        return self._materials.family(self.material)


def _fold(name: str) -> str:
    return " ".join(name.replace("-", " ").casefold().split())


def default_text(model: type[Part], name: str) -> str:
    """Return the default of a field as a user would write it; empty where there is none."""
    info = model.model_fields[name]
    if info.is_required() or info.default is None:
        return ""
    mark = unit_of(model, name)
    if mark is not None:
        return format_quantity(
            float(info.default), "K" if mark.unit == "degC" else mark.unit, mark.unit or None
        )
    return str(info.default) if isinstance(info.default, str) else ""


def unit_of(model: type[Part], name: str) -> Unit | None:
    """Return the declaration of a quantity field, or None where the field is no quantity."""
    info = model.model_fields[name]
    for mark in (*info.metadata, *(m for a in get_args(info.annotation) for m in get_args(a)[1:])):
        if isinstance(mark, Unit):
            return mark
    return None


def words_of(annotation: Any) -> tuple[str, ...]:
    """Return the words that a field may be, where it is one of several."""
    arguments = get_args(annotation)
    if arguments and all(isinstance(a, str) for a in arguments):
        return arguments
    return next((words for a in arguments if (words := words_of(a))), ())


def parts_of(model: type[Part]) -> Iterable[tuple[str, type[Part]]]:
    """Yield each field that holds tables of their own, with their declaration."""
    for name, info in model.model_fields.items():
        for candidate in _models(info.annotation):
            yield name, candidate


def _models(annotation: Any) -> Iterable[type[Part]]:
    if isinstance(annotation, type) and issubclass(annotation, Part):
        yield annotation
    for argument in get_args(annotation):
        yield from _models(argument)


def summary_of(kind: type[StruckObject]) -> str:
    """Return the one line that says what a kind is."""
    return kind.summary or (kind.__doc__ or "").strip().split("\n")[0].rstrip(".")
