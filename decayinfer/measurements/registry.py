"""The kinds of further measurements by name; a new module adds its class with one line here."""

from decayinfer.measurements.age import Age
from decayinfer.measurements.base import Measurement
from decayinfer.measurements.luminosity import ThermalLuminosity
from decayinfer.measurements.obliquity import Obliquity
from decayinfer.measurements.temperature import SurfaceTemperature

__all__ = ["MEASUREMENTS"]

_KINDS: tuple[type[Measurement], ...] = (Age, SurfaceTemperature, ThermalLuminosity, Obliquity)

#: Every kind, by the name of its column.
MEASUREMENTS: dict[str, type[Measurement]] = {next(iter(kind.columns())): kind for kind in _KINDS}
