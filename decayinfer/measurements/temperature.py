"""The effective temperature of the surface as seen from far away."""

from dataclasses import dataclass, field
from typing import ClassVar

from decayinfer.measurements.base import Array, Measurement, State

__all__ = ["SurfaceTemperature"]


@dataclass(frozen=True, kw_only=True)
class SurfaceTemperature(Measurement):
    """Effective temperature of the whole surface, redshifted to infinity [K]; see `Measurement`."""

    name: str = field(default="surface_temperature", init=False)
    unit: ClassVar[str] = "K"
    title: ClassVar[str] = "surface temperature"

    def predicted(self, state: State) -> Array:
        """Return the redshifted effective temperature, (n,) [K]."""
        return state.surface_temperature
