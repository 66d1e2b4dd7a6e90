"""What an independent age and a surface temperature add to an index, on an invented object; and one that contradicts.

Run it with ``python examples/age_and_temperature.py``; it takes about half a minute, most of it to compile the model
the first time.
"""

from dataclasses import replace

import numpy as np

import decayinfer as di
from decayinfer.measurements import Age, SurfaceTemperature

CHANNEL, SCENARIO = "phonon", "bsk24-fading-iron"

#: Its index alone leaves the mass at its prior.
BARE = di.Pulsar(
    name="Wren 5",
    period=0.31,
    period_derivative=4e-14,
    braking_index=9.0,
    braking_index_err_minus=0.5,
    braking_index_err_plus=0.5,
)

#: The same with the age of its remnant and the redshifted temperature of its surface.
KNOWN = replace(
    BARE,
    name="Wren 5 with age and temperature",
    measurements=(
        Age(value=5e4, err_minus=4e3, err_plus=4e3),
        SurfaceTemperature(value=1.0e6, err_minus=2e4, err_plus=2e4),
    ),
)

#: The same with an age ten times its characteristic age, which no spin-down reaches.
TOO_OLD = replace(
    BARE,
    name="Wren 5 with a wrong age",
    measurements=(Age(value=1.2e6, err_minus=1e5, err_plus=1e5),),
)


def main() -> None:
    """Fit the three and print 90 % intervals and flags."""
    settings = di.FitSettings(channels=(CHANNEL,), cooling=(SCENARIO,))
    for star in (BARE, KNOWN, TOO_OLD):
        (run,) = di.fit_object(star, settings).fits
        print(f"{star.name}: {', '.join(star.further()) or 'P, Pdot and n alone'}")
        for name, unit in (("age", "yr"), ("mass", "Msun"), ("phonon_time", "yr")):
            low, high = np.quantile(run.posterior(name), [0.05, 0.95])
            print(f"  {name}: {low:.3g} to {high:.3g} {unit}")
        if "measurements-disagree" in run.flags:
            print("  measurements-disagree: what was measured contradicts the index; do not quote these")


if __name__ == "__main__":
    main()
