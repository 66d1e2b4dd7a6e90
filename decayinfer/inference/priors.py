"""Prior distributions of the physical parameters, with the papers they come from."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from decayinfer.cooling.form import MASS_RANGE
from decayinfer.errors import InputError
from decayinfer.physics.lattice import FREEZE_OUT

__all__ = ["PRIOR_FIELDS", "Priors"]

_LN10 = float(np.log(10.0))
_POSITIVE = ("mass_mean", "max_age", "companion_period_min", "companion_period_max")

#: Columns of the array that `Priors.normals` returns.
PRIOR_FIELDS = (
    "phonon_time", "impurity_parameter", "hall_factor", "attractor_times", "birth_field", "birth_period", "umklapp",
)  # fmt: skip


@dataclass(frozen=True, kw_only=True)
class Priors:
    """Broad priors; a lognormal is given by its median and the standard deviation of its natural logarithm.

    Attributes
    ----------
    mass_mean, mass_sd : float
        Gaussian in mass [M_sun], cut to the masses that the cooling fits cover. Default: neutron stars near
        their birth mass, Ozel et al. 2012, ApJ 757, 55.
    phonon_time_median, phonon_time_sd : float
        Phonon timescale at 1e8 K [yr]. Default: the crust at a third of 1e14 g/cm^3, give or take a factor
        of three in time, by the scalings of Cumming, Arras & Zweibel 2004, ApJ 609, 999.
    impurity_parameter_median, impurity_parameter_sd : float
        Impurity parameter. Default: of order unity (Brown & Cumming 2009, ApJ 698, 1020) with room for the
        tens proposed for a disordered inner crust (Pons, Vigano & Rea 2013, Nat. Phys. 9, 431).
    hall_factor_median, hall_factor_sd : float
        Hall time over its value at the depth that the phonon time implies; a nuisance factor of our own.
    attractor_times_median, attractor_times_sd : float
        Age at the Hall attractor in Hall times of the birth field: a few (Gourgouliatos & Cumming 2014,
        PRL 112, 171101; the number three is from memory).
    birth_field_log10_mean, birth_field_log10_sd : float
        log10 of the equatorial birth field [G]. Default: between Gullon et al. 2014, MNRAS 443, 1891 and
        Graber et al. 2024, ApJ 968, 16, who let the field decay.
    birth_period_log10_mean, birth_period_log10_sd : float
        log10 of the birth period [s]. Default: Igoshev et al. 2022, MNRAS 514, 4606.
    umklapp_median, umklapp_sd : float
        Umklapp temperature [K]; spans the two published estimates at the depth of the default phonon time.
    freeze_out : str
        Law of the Umklapp freeze-out: none, exponential or cut.
    scatter_sd : float
        Scale of the half-normal prior on the logarithm of the factor, at least one, that multiplies the
        quoted error of n. Zero takes the error as quoted.
    max_age : float
        Stars are born at a constant rate up to about this age [yr], the end of the cooling fits; the taper is that of
        `decayinfer.inference.ages`.
    companion_mass_median, companion_mass_sd : float
        Mass of a wide companion [M_sun], from low-mass stars and white dwarfs to a few M_sun; a choice of ours.
    companion_period_min, companion_period_max : float
        Orbital period [yr], log-uniform between (Oepik's law, from memory); the data span takes the place of the
        shortest where it is known.
    spin_noise_own_log10_sd : float
        Error [dex] of an object's own estimate of the scale of nuddot, where none is given.
    glitch_step_median, glitch_step_sd : float
        |Delta nudot/nudot| of a glitch: 1e-4 to 1e-1 (Espinoza et al. 2011, MNRAS 414, 1679, from memory).
    glitch_own_step_sd : float
        Error of the logarithm of an object's own step.
    glitch_interval_median, glitch_interval_sd : float
        Time between glitches [yr]; years (the same survey, from memory).
    recovery_time_median, recovery_time_sd : float
        Time of the exponential recovery [yr]; tens to hundreds of days (from memory).
    """

    mass_mean: float = 1.28
    mass_sd: float = 0.24
    phonon_time_median: float = 1.5e5
    phonon_time_sd: float = 1.2
    impurity_parameter_median: float = 3.0
    impurity_parameter_sd: float = 1.5
    hall_factor_median: float = 1.0
    hall_factor_sd: float = 0.7
    attractor_times_median: float = 3.0
    attractor_times_sd: float = 0.5
    birth_field_log10_mean: float = 13.0
    birth_field_log10_sd: float = 0.6
    birth_period_log10_mean: float = -1.04
    birth_period_log10_sd: float = 0.53
    umklapp_median: float = 4e7
    umklapp_sd: float = 0.4
    freeze_out: str = "exponential"
    scatter_sd: float = 0.5
    max_age: float = 1e7
    companion_mass_median: float = 0.6
    companion_mass_sd: float = 0.9
    companion_period_min: float = 10.0
    companion_period_max: float = 1e6
    spin_noise_own_log10_sd: float = 0.3
    glitch_step_median: float = 3e-3
    glitch_step_sd: float = 1.7
    glitch_own_step_sd: float = 0.1
    glitch_interval_median: float = 3.0
    glitch_interval_sd: float = 1.0
    recovery_time_median: float = 0.2
    recovery_time_sd: float = 1.2

    def __post_init__(self) -> None:
        for name, value in vars(self).items():
            positive = name.endswith(("_sd", "_median")) or name in _POSITIVE
            zero_allowed = name == "scatter_sd"
            if positive and not (value > 0.0 or (zero_allowed and value == 0.0)):
                raise InputError(f"prior {name} must be positive, got {value}")
        if not self.companion_period_min < self.companion_period_max:
            raise InputError("prior companion_period_min must be below companion_period_max")
        if self.freeze_out not in FREEZE_OUT:
            raise InputError(f"freeze_out must be one of {', '.join(FREEZE_OUT)}, got {self.freeze_out!r}")

    @property
    def freeze(self) -> tuple[float, float]:
        """Strength and power of the freeze-out law."""
        law = FREEZE_OUT[self.freeze_out]
        return law.strength, law.power

    @property
    def mass_ln_norm(self) -> float:
        """Logarithm of the Gaussian's mass within the allowed range."""
        from scipy.stats import norm

        low, high = ((edge - self.mass_mean) / self.mass_sd for edge in MASS_RANGE)
        return float(np.log(norm.cdf(high) - norm.cdf(low)))

    def normals(self) -> NDArray[np.float64]:
        """Means and standard deviations of the logarithms named in `PRIOR_FIELDS`, internal units, (2, 7)."""
        lognormal = ["phonon_time", "impurity_parameter", "hall_factor", "attractor_times"]
        pairs = [(np.log(getattr(self, f"{f}_median")), getattr(self, f"{f}_sd")) for f in lognormal]
        pairs.append(((self.birth_field_log10_mean - 12.0) * _LN10, self.birth_field_log10_sd * _LN10))
        pairs.append((self.birth_period_log10_mean * _LN10, self.birth_period_log10_sd * _LN10))
        pairs.append((np.log(self.umklapp_median / 1e8), self.umklapp_sd))
        return np.array(pairs).T
