"""Finds, loads and isolates plugins. The only module that touches pluggy's hooks.

Hooks list things; the engine does the calling. A plugin that fails to import, to register or to list becomes a recorded
failure with plugin, distribution and stage, and the others go on.
"""

from __future__ import annotations

import contextlib
import os
import sys
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, field
from importlib.metadata import EntryPoint, entry_points
from types import ModuleType
from typing import Any

import pluggy

from strikeenergy.errors import PluginError, UnknownName
from strikeenergy.inputs import StruckObject
from strikeenergy.limit_tables import LimitTable, built_in_tables, parse_table
from strikeenergy.plugin import API_VERSION, Effect, HookSpecs

__all__ = ["GROUP", "PluginInfo", "Registry", "load", "short_reason"]

GROUP = "strikeenergy.plugins"
_HOOKS = ("strikeenergy_kinds", "strikeenergy_effects", "strikeenergy_tables")


@dataclass(frozen=True)
class PluginInfo:
    """A plugin that was found: its name, module, distribution and version, and what it lists."""

    name: str
    module: str
    distribution: str
    version: str
    kinds: tuple[str, ...] = ()
    effects: tuple[str, ...] = ()
    tables: tuple[str, ...] = ()


@dataclass
class Registry:
    """What is installed. Made anew by :func:`load`; nothing global."""

    plugins: list[PluginInfo] = field(default_factory=list)
    kinds: dict[str, type[StruckObject]] = field(default_factory=dict)
    effects: list[Effect] = field(default_factory=list)
    tables: list[LimitTable] = field(default_factory=list)
    """Those that plugins bring; :attr:`limit_tables` has the built-in ones as well."""
    failures: list[PluginError] = field(default_factory=list)
    owners: dict[str, PluginInfo] = field(default_factory=dict)
    """``kind conductor``, ``effect conductor.heating``, ``table ...`` to the plugin that brought it."""

    def kind(self, name: str) -> type[StruckObject]:
        """Return a kind of struck object.

        Raises:
            UnknownName: no such kind, with the nearest names.
        """
        if name not in self.kinds:
            raise UnknownName("kind", name, self.kinds)
        return self.kinds[name]

    @property
    def limit_tables(self) -> list[LimitTable]:
        """Every table of minimum sizes: the built-in ones and those that plugins bring."""
        return [*built_in_tables(), *self.tables]

    @property
    def standards(self) -> list[str]:
        """The standards that a case may name."""
        return list(dict.fromkeys(table.standard for table in self.limit_tables))

    def standard(self, name: str) -> str:
        """Return the name of a standard.

        Raises:
            UnknownName: there is no table of it; with the nearest names.
        """
        if name not in self.standards:
            raise UnknownName("standard", name, self.standards)
        return name

    def effects_of(self, kind: type[StruckObject]) -> list[Effect]:
        """Return the effects that apply to a kind, in a fixed order."""
        return [e for e in self.effects if issubclass(kind, e.kind)]

    def owner_of(self, effect: Effect) -> PluginInfo:
        """Return the plugin that brought an effect."""
        return self.owners[f"effect {kind_name(effect.kind)}.{effect.name}"]

    def versions(self) -> dict[str, str]:
        """Return distribution and version of each plugin, for reports."""
        return {p.name: f"{p.distribution} {p.version}" for p in self.plugins}


def kind_name(kind: type[StruckObject]) -> str:
    """Return the word that stands for a kind in a case file."""
    return str(kind.model_fields["kind"].default)


def short_reason(error: BaseException) -> str:
    """Say what went wrong in one line: the class of the error and what it says."""
    text = " ".join(str(error).split())[:300]
    return f"{type(error).__name__}: {text}" if text else type(error).__name__


def load(points: Iterable[EntryPoint] | None = None) -> Registry:
    """Find and load every plugin.

    Args:
        points: the entry points to load; by default those installed in the group ``strikeenergy.plugins``. The
            environment variable ``STRIKEENERGY_PLUGINS`` may name the only ones wanted, separated by commas.
    """
    registry = Registry()
    found = list(points if points is not None else entry_points(group=GROUP))
    wanted = os.environ.get("STRIKEENERGY_PLUGINS")
    if wanted is not None and wanted.strip():
        names = [name.strip() for name in wanted.split(",") if name.strip()]
        known = {point.name for point in found}
        found = [point for point in found if point.name in names]
        for name in names:
            if name not in known and name != "none":
                reason = (
                    f"the variable STRIKEENERGY_PLUGINS names it; installed are {', '.join(sorted(known))}"
                )
                registry.failures.append(PluginError(name, "not installed", "import", reason))
    # The built-in ones first: a clash of names must not throw out a kind that every case counts on.
    for point in sorted(found, key=lambda p: (not _is_own(p), p.name, p.value)):
        _load_one(registry, point)
    return registry


def _is_own(point: EntryPoint) -> bool:
    return point.dist is not None and point.dist.name == "strikeenergy"


def _load_one(registry: Registry, point: EntryPoint) -> None:
    distribution = point.dist.name if point.dist else "unknown distribution"
    version = point.dist.version if point.dist else "?"

    def failed(stage: str, error: BaseException | str) -> None:
        reason = error if isinstance(error, str) else short_reason(error)
        registry.failures.append(PluginError(point.name, distribution, stage, reason))

    clash = next((p for p in registry.plugins if p.name == point.name), None)
    if clash is not None:
        failed("register", f"the name {point.name!r} is taken by {clash.module} ({clash.distribution})")
        return
    try:
        with contextlib.redirect_stdout(sys.stderr):  # what a plugin prints must not mix with results
            module = point.load()
    except KeyboardInterrupt:
        raise
    except BaseException as error:  # a plugin may even call sys.exit at import
        failed("import", error)
        return
    manager = pluggy.PluginManager("strikeenergy")
    manager.add_hookspecs(HookSpecs)
    try:
        _check_module(module, point.name)
        manager.register(module, name=point.name)
        manager.check_pending()
    except Exception as error:
        failed("register", error)
        return
    info = PluginInfo(point.name, getattr(module, "__name__", point.value), distribution, version)
    listed: dict[str, list[Any]] = {}
    for hook in _HOOKS:
        try:
            listed[hook] = _call(manager, hook)
        except KeyboardInterrupt:
            raise
        except BaseException as error:
            failed("list", f"{hook}: {short_reason(error)}")
            return
    _take(registry, info, listed, lambda text: failed("register", text))


def _check_module(module: ModuleType, name: str) -> None:
    written_for = getattr(module, "STRIKEENERGY_API", None)
    if written_for != API_VERSION:
        raise TypeError(
            f"it states STRIKEENERGY_API = {written_for!r}; this program speaks version {API_VERSION}"
        )
    unknown = [
        n
        for n in dir(module)
        if n.startswith("strikeenergy_") and callable(getattr(module, n)) and n not in _HOOKS
    ]
    unknown = [n for n in unknown if hasattr(getattr(module, n), "strikeenergy_impl")]
    if unknown:
        raise TypeError(f"unknown hook {unknown[0]!r}; known: {', '.join(_HOOKS)}")


def _call(manager: pluggy.PluginManager, hook: str) -> list[Any]:
    caller = getattr(manager.hook, hook)
    with contextlib.redirect_stdout(sys.stderr):
        results = caller()
    if len(results) < len(caller.get_hookimpls()):
        raise TypeError("it returned nothing; return a list, which may be empty")
    return [item for result in results for item in result]


def _take(
    registry: Registry, info: PluginInfo, listed: dict[str, list[Any]], refuse: Callable[[str], None]
) -> None:
    """Take over what a plugin lists; a clash of names is refused, naming both."""
    kinds, effects, tables = [], [], []

    def free(what: str) -> bool:
        if what in registry.owners:
            refuse(
                f"{what} is already brought by plugin {registry.owners[what].name} ({registry.owners[what].distribution})"
            )
            return False
        registry.owners[what] = info
        return True

    for kind in listed["strikeenergy_kinds"]:
        if not (isinstance(kind, type) and issubclass(kind, StruckObject)):
            refuse(f"{kind!r} is listed as a kind and is no StruckObject")
        elif free(f"kind {kind_name(kind)}"):
            registry.kinds[kind_name(kind)] = kind
            kinds.append(kind_name(kind))
    for effect in listed["strikeenergy_effects"]:
        if not isinstance(effect, Effect):
            refuse(f"{effect!r} is listed as an effect and was not declared with @effect")
            continue
        other = _same_finding(registry, effect)
        if other:
            refuse(
                f"effect {effect.name}: the finding {other[0]!r} is already brought by plugin {other[1].name} ({other[1].distribution})"
            )
        elif free(f"effect {kind_name(effect.kind)}.{effect.name}"):
            registry.effects.append(effect)
            effects.append(f"{kind_name(effect.kind)}.{effect.name}")
    for raw in listed["strikeenergy_tables"]:
        if not isinstance(raw, Mapping):
            refuse(f"{raw!r} is listed as a table and is no mapping")
            continue
        try:
            table = parse_table(raw)
        except Exception as error:  # the content is the plugin's own
            refuse(short_reason(error))
            continue
        if free(f"table {table.name}"):
            registry.tables.append(table)
            tables.append(table.name)
    registry.plugins.append(
        PluginInfo(
            info.name,
            info.module,
            info.distribution,
            info.version,
            tuple(kinds),
            tuple(effects),
            tuple(tables),
        )
    )


def _same_finding(registry: Registry, effect: Effect) -> tuple[str, PluginInfo] | None:
    for known in registry.effects:
        if issubclass(known.kind, effect.kind) or issubclass(effect.kind, known.kind):
            for name in effect.findings:
                if name in known.findings:
                    return name, registry.owner_of(known)
    return None
