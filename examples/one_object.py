"""Fit one invented object from Python and print what was learnt, prior beside posterior.

Run it with ``python examples/one_object.py``; it takes about half a minute, most of it to compile the model the
first time.
"""

import numpy as np

import decayinfer as di


def main() -> None:
    """Fit the object and print a line per parameter."""
    star = di.Pulsar(
        name="Wren 3",
        period=0.31,
        period_derivative=4e-14,
        braking_index=21.0,
        braking_index_err_minus=1.5,
        braking_index_err_plus=1.5,
    )
    settings = di.FitSettings(channels=("phonon", "phonon+hall"), cooling=("bsk24-protons-iron",))
    for run in di.fit_object(star, settings).fits:
        print(f"{run.channel}: ln p(n | P, Pdot) = {run.ln_evidence:.2f} +- {run.ln_evidence_err:.2f}")
        for name, unit in (("mass", "Msun"), ("phonon_time", "yr"), ("age", "yr")):
            prior, posterior = (
                np.quantile(draws(name), [0.05, 0.95]) for draws in (run.prior, run.posterior)
            )
            print(
                f"  {name}: {posterior[0]:.3g} to {posterior[1]:.3g} {unit}"
                f" (prior {prior[0]:.3g} to {prior[1]:.3g})"
            )


if __name__ == "__main__":
    main()
