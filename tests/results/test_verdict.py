"""The wording of verdicts."""

import numpy as np
import pytest

from decayinfer.inference.outcome import ChannelFit, ObjectFit, Status
from decayinfer.results.average import channel_probabilities
from decayinfer.results.verdict import Constraint, Interval, constraint, verdict

PRIOR = Interval(1.0, 1.3, 1.6)
SAME = Interval(1.01, 1.31, 1.59)


def probabilities(evidences, failed=(), unreachable=(), reason="n lies too far"):
    fits = [
        ChannelFit("A", "s", c, Status.OK, ln_evidence=z, ln_evidence_err=0.01) for c, z in evidences.items()
    ]
    fits += [ChannelFit("A", "s", c, Status.FAILED, reason="x") for c in failed]
    fits += [
        ChannelFit("A", "s", c, Status.UNREACHABLE, reason=reason, ln_evidence=-np.inf) for c in unreachable
    ]
    return channel_probabilities(ObjectFit("A", tuple(fits), {"s": 1.0}))


def test_close_odds_and_a_mass_that_repeats_its_prior():
    p = probabilities({"hall": 0.0, "phonon+hall": np.log(1.6), "phonon": np.log(0.9)})
    assert verdict(p, SAME, PRIOR) == (
        "phonon+hall most probable (0.46), odds 1.6:1 over hall, too close to call; "
        "the index does not constrain the mass (posterior as wide as its prior)"
    )


@pytest.mark.parametrize(
    ("ratio", "said"),
    [(2.9, "2.9:1 over hall, too"), (4.0, "4.0:1 over hall;"), (57.3, "57:1"), (5e4, "above 1000:1")],
)
def test_odds(ratio, said):
    assert said in verdict(probabilities({"hall": 0.0, "phonon": np.log(ratio)}), SAME, PRIOR)


@pytest.mark.parametrize(
    ("mass", "kind", "said"),
    [
        (SAME, Constraint.NONE, "does not constrain the mass"),
        (
            Interval(1.0, 1.4, 1.6),
            Constraint.MOVED,
            "moves the mass up without narrowing it (median 1.40, prior 1.30 Msun)",
        ),
        (Interval(1.0, 1.2, 1.6), Constraint.MOVED, "moves the mass down"),
        (
            Interval(1.1, 1.3, 1.55),
            Constraint.WEAK,
            "narrows the mass a little, to 1.10-1.55 Msun (75 % of the prior",
        ),
        (
            Interval(1.4, 1.5, 1.6),
            Constraint.STRONG,
            "constrains the mass to 1.40-1.60 Msun (33 % of the prior's width)",
        ),
    ],
)
def test_mass(mass, kind, said):
    assert constraint(mass, PRIOR) is kind
    assert said in verdict(probabilities({"hall": 0.0, "phonon": 3.0}), mass, PRIOR)


def test_no_mass_no_word_about_it():
    assert constraint(Interval(), PRIOR) is Constraint.UNKNOWN
    assert "mass" not in verdict(probabilities({"hall": 0.0, "phonon": 3.0}), Interval(), Interval())


def test_a_single_channel_is_not_called_probable():
    assert verdict(probabilities({"hall": 0.0}), Interval(), Interval()) == "hall is the only channel fitted"
    assert verdict(probabilities({"hall": 0.0}, unreachable=["phonon"]), Interval(), Interval()) == (
        "hall is the only channel that reaches the index"
    )


def test_failed_runs_are_owned_up_to():
    said = verdict(probabilities({"hall": 0.0, "phonon": 0.0}, failed=["impurity"]), Interval(), Interval())
    assert said.endswith("1 of 3 posterior runs failed and are left out")


def test_no_channel_at_all():
    p = probabilities({}, unreachable=["hall", "phonon"])
    assert verdict(p, Interval(), Interval()) == "no channel reaches this index: n lies too far"
    p = probabilities({}, failed=["hall"], unreachable=["phonon"], reason="")
    assert verdict(p, Interval(), Interval()) == "no channel that ran reaches this index"
    p = probabilities({}, failed=["hall"])
    assert verdict(p, Interval(), Interval()).startswith("no posterior run succeeded")
