"""Channel probabilities against hand numbers, and averaged draws."""

import numpy as np
import pytest

from decayinfer.inference.outcome import ChannelFit, ObjectFit, Status
from decayinfer.results.average import channel_probabilities, mix_draws


def fit(scenario, channel, ln_evidence, err=0.0, status=Status.OK):
    return ChannelFit("A", scenario, channel, status, ln_evidence=ln_evidence, ln_evidence_err=err)


def objectfit(*fits, weights=None):
    return ObjectFit("A", fits, weights or {"s": 1.0})


def test_two_channels_with_evidence_ratio_three():
    p = channel_probabilities(objectfit(fit("s", "hall", -10.0), fit("s", "phonon", -10.0 + np.log(3.0))))
    np.testing.assert_allclose(p.values, [0.25, 0.75], rtol=1e-14)
    np.testing.assert_allclose(p.prior, [0.5, 0.5])


def test_prior_odds_and_scenario_weights_multiply():
    fits = [fit(s, c, -5.0) for s in ("s", "t") for c in ("hall", "phonon")]
    p = channel_probabilities(objectfit(*fits, weights={"s": 0.8, "t": 0.2}), {"hall": 3.0})
    np.testing.assert_allclose(p.values, [0.6, 0.2, 0.15, 0.05], rtol=1e-14)
    assert p.of_channel("hall")[0] == pytest.approx(0.75)
    np.testing.assert_allclose(p.within("t").values, [0.75, 0.25], rtol=1e-14)
    np.testing.assert_allclose(p.within("t").prior, [0.75, 0.25], rtol=1e-14)


def test_extreme_evidences_do_not_overflow():
    p = channel_probabilities(objectfit(fit("s", "hall", -3000.0), fit("s", "phonon", 900.0)))
    np.testing.assert_array_equal(p.values, [0.0, 1.0])


def test_unreachable_is_zero_and_failed_is_left_out():
    p = channel_probabilities(
        objectfit(
            fit("s", "constant", -np.inf, status=Status.UNREACHABLE),
            fit("s", "hall", np.nan, status=Status.FAILED),
            fit("s", "phonon", -7.0),
            fit("s", "impurity", -7.0),
        )
    )
    np.testing.assert_allclose(p.values, [0.0, np.nan, 0.5, 0.5])
    np.testing.assert_allclose(p.prior, [1 / 3, 0.0, 1 / 3, 1 / 3])
    assert np.isnan(p.of_channel("hall")).all()
    assert p.of_channel("constant")[0] == 0.0


def test_nothing_is_known_when_every_channel_is_unreachable():
    p = channel_probabilities(
        objectfit(*(fit("s", c, -np.inf, status=Status.UNREACHABLE) for c in ("hall", "phonon")))
    )
    assert not p.known
    assert np.isnan(p.values).all()
    assert np.isnan(p.of_channel("hall")).all()


def test_errors_of_two_channels_by_hand():
    # p = 1/(1 + e^-d), so dp = p (1 - p) sqrt(s1^2 + s2^2): 0.25 * 0.05 at even odds.
    p = channel_probabilities(objectfit(fit("s", "hall", -5.0, 0.03), fit("s", "phonon", -5.0, 0.04)))
    assert p.of_channel("hall") == pytest.approx((0.5, 0.0125))


def test_errors_match_scatter_of_noisy_evidences():
    random = np.random.default_rng(3)
    ln_z, err = np.array([-5.0, -5.5, -4.2, -6.0]), np.array([0.02, 0.05, 0.03, 0.01])
    labels = [(s, c) for s in ("s", "t") for c in ("hall", "phonon")]
    weights = {"s": 0.5, "t": 0.5}

    def of_hall(values):
        fits = [fit(*label, z, e) for label, z, e in zip(labels, values, err, strict=True)]
        return channel_probabilities(objectfit(*fits, weights=weights)).of_channel("hall")

    scatter = np.std([of_hall(ln_z + err * random.normal(size=4))[0] for _ in range(4000)])
    # The standard deviation of 4000 normal values is good to 1.1 %; 4 % is 3.6 of its sigmas.
    assert of_hall(ln_z)[1] == pytest.approx(scatter, rel=0.04)


def test_mixed_draws_come_in_proportion():
    draws = [np.full(1000, 0.0), np.full(1000, 1.0), np.full(1000, 2.0)]
    mixed = mix_draws(draws, np.array([0.25, 0.75, np.nan]), seed=1, name="A")
    assert mixed.size == 1000
    assert np.count_nonzero(mixed == 1.0) == 750
    assert not np.any(mixed == 2.0)


def test_mixed_draws_depend_on_seed_and_name_alone():
    draws = [np.arange(100.0), np.arange(100.0, 200.0)]
    weights = np.array([0.4, 0.6])
    first = mix_draws(draws, weights, seed=1, name="A")
    np.testing.assert_array_equal(first, mix_draws(draws, weights, seed=1, name="A"))
    assert not np.array_equal(first, mix_draws(draws, weights, seed=2, name="A"))
    assert not np.array_equal(first, mix_draws(draws, weights, seed=1, name="B"))


def test_mixed_draws_keep_correlations_and_repeat_no_draw():
    x = [np.arange(100.0), np.arange(100.0, 200.0)]
    weights = np.array([0.3, 0.7])
    mixed = mix_draws(x, weights, seed=1, name="A")
    np.testing.assert_array_equal(mix_draws([2.0 * d for d in x], weights, seed=1, name="A"), 2.0 * mixed)
    assert len(set(mixed)) == mixed.size


def test_runs_that_do_not_define_a_quantity_take_no_part():
    mixed = mix_draws(
        [np.empty(0), np.full(50, 1.0), np.full(50, 2.0)], np.array([0.8, 0.1, 0.1]), seed=1, name="A"
    )
    assert np.count_nonzero(mixed == 1.0) == 25
    assert mix_draws([np.empty(0)], np.array([1.0]), seed=1, name="A").size == 0
    assert mix_draws([np.ones(5)], np.array([0.0]), seed=1, name="A").size == 0
