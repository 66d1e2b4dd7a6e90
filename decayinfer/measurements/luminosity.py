"""The thermal luminosity of the whole surface as seen from far away."""

from dataclasses import dataclass, field
from typing import ClassVar

from decayinfer.measurements.base import Array, Measurement, State

__all__ = ["ThermalLuminosity"]


@dataclass(frozen=True, kw_only=True)
class ThermalLuminosity(Measurement):
    """Bolometric thermal luminosity, redshifted to infinity [erg/s]; see `Measurement`."""

    name: str = field(default="thermal_luminosity", init=False)
    unit: ClassVar[str] = "erg / s"
    title: ClassVar[str] = "thermal luminosity"

    def predicted(self, state: State) -> Array:
        """Return the redshifted luminosity, (n,) [erg/s]."""
        return state.luminosity
