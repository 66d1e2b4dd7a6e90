"""Does the tool name the right explanation, and no decay in pure noise?

    python tests/studies/recovery.py noise --jobs 2       200 invented objects of nothing but spin noise
    python tests/studies/recovery.py channels --jobs 2    40 invented objects from each channel in turn

Objects are invented by inventing.py. Every channel is fitted under the scenario that they were drawn with.

The first study takes the probabilities that a user sees, from p(n | P, Pdot, channel). In the second the objects of
each channel are equally many, so P and Pdot tell channels apart too, and so does how often a channel passes the
selection: probabilities are then those of p(n, P, Pdot | channel) over the share of its stars that are selected.
"""

import argparse
import sys
from concurrent.futures import ProcessPoolExecutor
from dataclasses import replace
from multiprocessing import get_context
from pathlib import Path

import numpy as np

from decayinfer.channels.registry import channel_names, load_channel
from decayinfer.cooling.registry import load_scenario
from decayinfer.inference.fit import fit_object
from decayinfer.inference.settings import FitSettings

sys.path.insert(0, str(Path(__file__).parent))
import recording
from inventing import Selection, invent

SCENARIO = "bsk24-protons-iron"
SELECTION = Selection(periods=(0.02, 5.0), ages=(5e3, 3e6), indices=(-300.0, 300.0), errors=(0.3, 3.0))
BATCH = 20_000
SETTINGS = FitSettings(draws=500, tune=300, cooling=(SCENARIO,))


def objects_of(name, count, seed):
    """Objects of one channel, and the share of its stars that are selected."""
    rng = np.random.default_rng([seed, *name.encode()])
    found, share = invent(load_channel(name), load_scenario(SCENARIO), count, rng, SELECTION, batch=BATCH)
    return [replace(star, name=f"{name} {i}") for i, (star, _) in enumerate(found)], share


def classify(pulsar, truth, settings=SETTINGS):
    """Evidences of every channel; minus infinity out of reach, nan where the fit failed."""
    fits = fit_object(pulsar, settings).fits
    return {
        "object": pulsar.name, "truth": truth, "period": pulsar.period,
        "period_derivative": pulsar.period_derivative, "braking_index": pulsar.braking_index,
        "braking_index_err": pulsar.braking_index_err,
        "ln_evidence": {fit.channel: float(fit.ln_evidence) for fit in fits},
        "ln_evidence_joint": {fit.channel: float(fit.ln_evidence_joint) for fit in fits},
    }  # fmt: skip


def probabilities(ln_evidence, ln_odds=None):
    """Probabilities of channels by their evidences and prior odds; failed ones are left out."""
    ln_terms = {c: v + (ln_odds or {}).get(c, 0.0) for c, v in ln_evidence.items() if not np.isnan(v)}
    top = max(ln_terms.values())
    terms = {c: np.exp(v - top) for c, v in ln_terms.items()}
    return {c: float(v / sum(terms.values())) for c, v in terms.items()}


def decay_probability(row):
    chances = probabilities(row["ln_evidence"])
    return sum(p for c, p in chances.items() if load_channel(c).decays)


def work(items, jobs):
    with ProcessPoolExecutor(jobs, mp_context=get_context("spawn")) as pool:
        return list(pool.map(_one, items, chunksize=1))


def _one(item):
    return classify(*item)


def main():
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("study", choices=("noise", "channels"))
    parser.add_argument("--objects", type=int)
    parser.add_argument("--jobs", type=int, default=1)
    parser.add_argument("--seed", type=int, default=2026)
    asked = parser.parse_args()
    count = asked.objects or {"noise": 200, "channels": 40}[asked.study]
    names = ("spin-noise",) if asked.study == "noise" else channel_names()
    invented = {name: objects_of(name, count, asked.seed) for name in names}
    rows = work([(star, name) for name in names for star in invented[name][0]], asked.jobs)
    recording.write(
        f"recovery-{asked.study}", rows, objects=count, seed=asked.seed, scenario=SCENARIO, draws=SETTINGS.draws,
        tune=SETTINGS.tune, selected={name: share for name, (_, share) in invented.items()},
    )  # fmt: skip
    if asked.study == "noise":
        decay = np.array([decay_probability(row) for row in rows])
        print("mean probability of decay", decay.mean(), "above 0.95:", np.mean(decay > 0.95))


if __name__ == "__main__":
    main()
