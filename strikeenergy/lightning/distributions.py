"""The laws of the lightning statistics: those of one quantity, and the joint law of several."""

from __future__ import annotations

from strikeenergy.lightning.joint import Correlation, JointLaw
from strikeenergy.lightning.marginals import LogNormal, Mixture, StrokeNumber, TwoSlopeLogNormal

__all__ = ["Correlation", "JointLaw", "LogNormal", "Mixture", "StrokeNumber", "TwoSlopeLogNormal"]
