"""The sheet: what may be said of it."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Annotated, Any, ClassVar, Literal

from strikeenergy.api import OfMaterial, Quantity, Unit


class Sheet(OfMaterial):
    """A metal sheet, cladding or pipe wall that the flash strikes: the arc has its root on it."""

    kind: Literal["sheet"] = "sheet"
    thickness: Annotated[Quantity, Unit("mm", gt=0, typical=(0.5, 8), example="0.7 mm")]
    """Thickness of the metal, without paint or membrane."""
    drop: Annotated[Quantity, Unit("V", gt=0, le=100, typical=(8, 16), example="12 V")] | None = None
    """Anode or cathode drop that heats the root. Without it 12 V, with 8 V to 16 V as the assumed range."""
    concern: Literal["none", "puncture", "hot spot"] | None = None
    """What matters below the sheet: none (a hole is acceptable), puncture, or a hot spot on the rear face."""

    summary: ClassVar[str] = "a metal sheet, cladding or pipe wall that the arc has its root on"
    uses: ClassVar[Mapping[str, str]] = {"air termination": "natural component of the air-termination system"}
    example_fields: ClassVar[Mapping[str, Any]] = {
        "use": "air termination",
        "material": "aluminium",
        "thickness": "0.7 mm",
        "concern": "none",
    }

    def sizes(self) -> Mapping[str, Quantity]:
        """Return the sizes that limit tables may ask for."""
        return {"thickness": self.thickness}
