"""Plot of a reduced record."""

from __future__ import annotations

import os
from typing import Any

import numpy as np

from strikeenergy.formatting import engineering, format_quantity, pretty
from strikeenergy.lightning.reduction import Reduction
from strikeenergy.units import convert

__all__ = ["write_record_svg"]


def write_record_svg(reduction: Reduction, path: str | os.PathLike[str]) -> None:
    """Write a plot of the current and of the running charge and specific energy as SVG.

    Three axes over one time: current with peak, 10/50/90 % levels and the virtual origin; charge; W/R. Time counts from
    the virtual origin. Where the stroke is short against the record, the time axis ends where charge and W/R no longer
    grow. The same reduction gives the same bytes: no date, no random names, text as text.

    Args:
        reduction: of a record.
        path: file to write; an existing one is replaced.
    """
    from matplotlib import rc_context
    from matplotlib.backends.backend_svg import FigureCanvasSVG
    from matplotlib.figure import Figure

    curves = reduction.curves
    origin = reduction.origin if reduction.origin is not None else float(curves.t[0])
    time = curves.t - origin
    shown = slice(*_interesting(reduction, time))
    with rc_context({"svg.hashsalt": "strikeenergy", "svg.fonttype": "none", "font.family": "sans-serif"}):
        figure = Figure(figsize=(8, 8), layout="constrained")
        FigureCanvasSVG(figure)
        axes: Any = figure.subplots(3, 1, sharex=True)
        rows = (
            ("current", curves.i, "A"),
            ("charge", curves.charge, "C"),
            ("W/R", curves.specific_energy, "J/ohm"),
        )
        time_unit = _time_unit(float(time[shown][-1]))
        x = np.asarray(convert(time[shown], time_unit))
        for axis, (name, values, unit) in zip(axes, rows, strict=True):
            part = values[shown]
            with_prefix = engineering(float(np.max(np.abs(part))), unit)
            axis.plot(x, np.asarray(convert(part, with_prefix)), color="#1f4e79", linewidth=1.2)
            axis.set_ylabel(f"{name} ({pretty(with_prefix)})")
            axis.grid(True, color="#dddddd", linewidth=0.6)
        peak = reduction.peak.value or 0.0
        current_unit = engineering(float(np.max(np.abs(curves.i[shown]))), "A")
        for level in (0.1, 0.5, 0.9):
            height = float(convert(level * peak, current_unit))
            axes[0].axhline(height, color="#999999", linewidth=0.6, linestyle="--")
        axes[-1].set_xlabel(f"time from the virtual origin ({pretty(time_unit)})")
        axes[0].set_title(_title(reduction), fontsize=9)
        figure.savefig(path, format="svg", metadata={"Date": None, "Creator": "strikeenergy"})


def _interesting(reduction: Reduction, time: np.ndarray[Any, Any]) -> tuple[int, int]:
    """Return first and one past the last point of a curve to show."""
    t2 = reduction.half_value_time.value
    if not t2:
        return 0, time.size
    charge, energy = reduction.curves.charge, reduction.curves.specific_energy
    growing = (charge < 0.995 * charge[-1]) | (energy < 0.995 * energy[-1])
    last = int(np.flatnonzero(growing)[-1]) + 2 if growing.any() else time.size
    last = max(last, int(np.searchsorted(time, 4 * t2)))
    return max(int(np.searchsorted(time, -0.1 * t2)) - 1, 0), min(last, time.size)


def _time_unit(longest: float) -> str:
    return "µs" if longest < 2e-3 else "ms" if longest < 2 else "s"


def _title(reduction: Reduction) -> str:
    parts = [
        f"{label} {format_quantity(measured.value, measured.unit)}"
        for label, measured in (
            ("I", reduction.peak),
            ("Q", reduction.charge),
            ("W/R", reduction.specific_energy),
        )
        if measured.value is not None
    ]
    for label, measured in (("T1", reduction.front_time), ("T2", reduction.half_value_time)):
        if measured.value is not None:
            parts.append(f"{label} {format_quantity(measured.value * 1e6, None)} µs")
    sign = "positive" if reduction.polarity > 0 else "negative, shown positive"
    # A dollar sign in a file name would start a formula.
    name = os.path.basename(reduction.record).replace("$", r"\$")
    return "\n".join(line for line in (name, ", ".join([*parts, sign])) if line)
