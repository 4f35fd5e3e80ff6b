"""The current of a stroke as a function of time, with everything that follows from it.

A waveform takes SI numbers or arrays (one waveform per element; they broadcast), or texts with a unit ("200 kA"), and
gives back SI. ``w.current(t)`` broadcasts the times against the parameters: for an array of waveforms give the times
a first axis of their own, ``w.current(t[:, None])``.

``peak`` is the true peak of the curve. For ``Heidler(..., normalise="standard")`` and ``ConcaveFront`` it differs from
the nominal one that was given, which stays in ``nominal``.
"""

from __future__ import annotations

from strikeenergy.lightning.designations import SHAPES, designation, from_shape
from strikeenergy.lightning.figures import DEFINITIONS, lower_point
from strikeenergy.lightning.parameters import read_parameter
from strikeenergy.lightning.piecewise_shapes import ConcaveFront, LinearFront, Rectangle, Trapezoid, Triangle
from strikeenergy.lightning.pulse import Pulse
from strikeenergy.lightning.sampled import Sampled
from strikeenergy.lightning.smooth_shapes import DoubleExponential, Heidler, PowerExponential
from strikeenergy.lightning.sums import Sum, Waveform

__all__ = [
    "DEFINITIONS",
    "SHAPES",
    "ConcaveFront",
    "DoubleExponential",
    "Heidler",
    "LinearFront",
    "PowerExponential",
    "Pulse",
    "Rectangle",
    "Sampled",
    "Sum",
    "Trapezoid",
    "Triangle",
    "Waveform",
    "designation",
    "from_shape",
    "lower_point",
    "read_parameter",
]
