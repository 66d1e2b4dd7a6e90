"""What may be known of an object beside its spin: age, surface temperature, thermal luminosity, obliquity."""

from decayinfer.measurements.age import Age
from decayinfer.measurements.base import Measurement, State
from decayinfer.measurements.luminosity import ThermalLuminosity
from decayinfer.measurements.obliquity import Obliquity
from decayinfer.measurements.registry import MEASUREMENTS
from decayinfer.measurements.temperature import SurfaceTemperature

__all__ = [
    "MEASUREMENTS",
    "Age",
    "Measurement",
    "Obliquity",
    "State",
    "SurfaceTemperature",
    "ThermalLuminosity",
]
