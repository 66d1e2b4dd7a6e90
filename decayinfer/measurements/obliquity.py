"""The angle between spin and magnetic axis, from polarisation or pulse shapes."""

from dataclasses import dataclass, field
from typing import ClassVar

import numpy as np

from decayinfer.measurements.base import Array, Measurement, State

__all__ = ["Obliquity"]

_CELLS = 4000  # of the average over directions


@dataclass(frozen=True, kw_only=True)
class Obliquity(Measurement):
    """Obliquity [deg], 0 to 90; see `Measurement`.

    A channel that does not move the axis leaves it where it was at birth, in any direction alike: there the
    likelihood is averaged over sin(a) da, so that its evidence stands on the same footing as that of one that does.
    """

    name: str = field(default="obliquity", init=False)
    unit: ClassVar[str] = "deg"
    title: ClassVar[str] = "obliquity"
    high: ClassVar[float] = 90.0

    def predicted(self, state: State) -> Array | None:
        """Return the obliquity, (n,) [deg], where the channel has one."""
        return state.obliquity

    def _ln_unpredicted(self) -> float:
        angle = 90.0 * (np.arange(_CELLS) + 0.5) / _CELLS
        weights = np.sin(np.radians(angle))
        ln_density = self._ln_density(angle)
        top = float(ln_density.max())
        return top + float(np.log(np.average(np.exp(ln_density - top), weights=weights)))
