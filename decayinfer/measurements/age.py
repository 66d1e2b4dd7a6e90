"""An independent age: of a supernova remnant, from a proper motion, from a historical record."""

from dataclasses import dataclass, field
from typing import ClassVar

from decayinfer.measurements.base import Array, Measurement, State

__all__ = ["Age"]


@dataclass(frozen=True, kw_only=True)
class Age(Measurement):
    """Time since birth [yr]; see `Measurement`."""

    name: str = field(default="age", init=False)
    unit: ClassVar[str] = "yr"
    title: ClassVar[str] = "age"

    def predicted(self, state: State) -> Array:
        """Return the age, (n,) [yr]."""
        return state.age
