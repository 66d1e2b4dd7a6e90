"""The record of one object as inference sees it."""

from dataclasses import dataclass, field

import numpy as np

from decayinfer.measurements import Measurement
from decayinfer.physics import torque
from decayinfer.physics.constants import B_UNIT_G

__all__ = ["Pulsar"]


@dataclass(frozen=True, kw_only=True)
class Pulsar:
    """One object's measurements, in internal units; nan where a quantity was not given.

    Attributes
    ----------
    name : str
        Name, unique in its table.
    period, period_err : float
        Spin period and its error [s].
    period_derivative, period_derivative_err : float
        Period derivative and its error [s/s].
    braking_index : float
        Observed braking index n = nu nuddot / nudot^2.
    braking_index_err_minus, braking_index_err_plus : float
        Quoted one-sigma errors below and above, both positive.
    braking_index_limit : float
        Upper limit on n, for an object without a measured index.
    measurements : tuple of Measurement
        What else was measured, see `decayinfer.measurements`.
    data_span : float
        Length of the timing data [yr].
    glitch_nudot_step : float
        Size |Delta nudot/nudot| of the last glitch's step.
    glitch_time_since : float
        Time since the last glitch [yr].
    spin_noise_log10_scale, spin_noise_log10_scale_err : float
        log10 of the second frequency derivative |nuddot| [Hz/s^2] that spin noise is estimated to make, and its error.
    index_kind : str
        ``"interglitch"`` or ``"long-term"``, how the index was measured; empty when not said.
    flags : tuple of str
        Remarks of the reader, such as ``"old"`` for a characteristic age beyond the cooling fits.
    """

    name: str
    period: float
    period_derivative: float
    period_err: float = np.nan
    period_derivative_err: float = np.nan
    braking_index: float = np.nan
    braking_index_err_minus: float = np.nan
    braking_index_err_plus: float = np.nan
    braking_index_limit: float = np.nan
    measurements: tuple[Measurement, ...] = ()
    data_span: float = np.nan
    glitch_nudot_step: float = np.nan
    glitch_time_since: float = np.nan
    spin_noise_log10_scale: float = np.nan
    spin_noise_log10_scale_err: float = np.nan
    index_kind: str = ""
    flags: tuple[str, ...] = field(default=())

    @property
    def characteristic_age(self) -> float:
        """Characteristic age tau_c = P / (2 Pdot) [yr]."""
        return float(torque.characteristic_age(self.period, self.period_derivative))

    @property
    def dipole_field(self) -> float:
        """Equatorial field of an orthogonal rotator in vacuum, R = 10 km, I = 1e45 g cm^2 [G]."""
        return float(torque.dipole_field(self.period, self.period_derivative)) * B_UNIT_G

    @property
    def braking_index_err(self) -> float:
        """Mean of the errors below and above."""
        return 0.5 * self.braking_index_err_minus + 0.5 * self.braking_index_err_plus

    @property
    def decay_time(self) -> float:
        """Time 4 tau_c/(n - 3) in which the field falls by e if decay alone makes n [yr]; nan for n <= 3."""
        if not self.braking_index > 3.0:
            return np.nan
        return float(torque.decay_time(self.braking_index, self.characteristic_age))

    def further(self) -> tuple[str, ...]:
        """Return in words what is known beside the spin, one sentence part each."""
        numbers = {
            "data span {:.4g} yr": self.data_span,
            "glitch step in nudot {:.3g}": self.glitch_nudot_step,
            "{:.4g} yr since the glitch": self.glitch_time_since,
            "spin noise 10^{:.2f} Hz/s2": self.spin_noise_log10_scale,
        }
        facts = [text.format(value) for text, value in numbers.items() if np.isfinite(value)]
        kind = [f"{self.index_kind} index"] if self.index_kind else []
        return (*map(str, self.measurements), *facts, *kind)
