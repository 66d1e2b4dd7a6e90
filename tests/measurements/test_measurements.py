"""Likelihoods of further measurements: normalised, censored, and what they say of a state."""

from dataclasses import asdict

import numpy as np
import pytest
from scipy import integrate, stats

from decayinfer.errors import InputError
from decayinfer.measurements import MEASUREMENTS, Age, Obliquity, State, SurfaceTemperature, ThermalLuminosity

ALPHA = 1e-3
ERRORS = [(1.0, 1.0), (0.4, 2.0), (3.0, 0.7)]


def state(**known):
    """A state in which everything but what is given is no number, as in nothing else being read."""
    shape = np.shape(next(iter(known.values())))
    other = dict.fromkeys(State._fields, np.full(shape, np.nan)) | {"obliquity": None}
    return State(**other | {name: np.asarray(value, dtype=float) for name, value in known.items()})


def ln_of(measurement, values):
    field = {"thermal_luminosity": "luminosity"}.get(measurement.name, measurement.name)
    return measurement.ln_likelihood(state(**{field: np.asarray(values, dtype=float)}))


def values_of(kind):
    return {Obliquity: 40.0}.get(kind, 30.0)


@pytest.mark.parametrize("kind", MEASUREMENTS.values())
@pytest.mark.parametrize(("minus", "plus"), ERRORS)
def test_density_of_the_observed_value_is_normalised(kind, minus, plus):
    """Over what might have been observed of one truth, by quadrature."""
    truth = values_of(kind)

    def density(observed):
        return float(np.exp(ln_of(kind(value=observed, err_minus=minus, err_plus=plus), [truth])[0]))

    whole = sum(integrate.quad(density, a, b)[0] for a, b in [(1.0, truth), (truth, 2.0 * truth)])
    assert whole == pytest.approx(1.0, abs=1e-8)


@pytest.mark.parametrize("kind", MEASUREMENTS.values())
def test_a_symmetric_value_is_a_normal(kind):
    x = np.linspace(1.0, 80.0, 50)
    found = ln_of(kind(value=30.0, err_minus=7.0, err_plus=7.0), x)
    np.testing.assert_allclose(found, stats.norm.logpdf(x, 30.0, 7.0), rtol=1e-13)


def test_each_side_has_its_own_error():
    """A truth two upper errors above is as likely as one two lower errors below."""
    above, below, same = ln_of(Age(value=30.0, err_minus=2.0, err_plus=9.0), [48.0, 26.0, 30.0])
    assert above == below == same - 2.0


@pytest.mark.parametrize(("width", "sharp"), [(np.nan, 1.5), (4.0, 4.0)])
def test_limits_are_censored(width, sharp):
    """The probability that a measurement with that error fell below, or above; 5 % of the edge when not given."""
    x = np.linspace(1.0, 90.0, 60)
    upper = ln_of(Age(upper=30.0, err_plus=width), x)
    np.testing.assert_allclose(upper, stats.norm.logcdf((30.0 - x) / sharp), rtol=1e-12)
    lower = ln_of(Age(lower=30.0, err_minus=width), x)
    np.testing.assert_allclose(lower, stats.norm.logcdf((x - 30.0) / sharp), rtol=1e-12)


def test_a_limit_is_the_integral_of_the_values_it_stands_for():
    def density(observed):
        return float(np.exp(ln_of(Age(value=observed, err_minus=4.0, err_plus=4.0), [33.0])[0]))

    mass = integrate.quad(density, 1e-9, 30.0)[0]
    assert ln_of(Age(upper=30.0, err_plus=4.0), [33.0])[0] == pytest.approx(np.log(mass), abs=1e-9)


def test_an_interval_is_a_soft_box():
    """Flat inside, one half at the ends, as wide in all as the interval; its edges no softer than a tenth of it."""
    box = Age(lower=1000.0, upper=1010.0)
    inside, end, out = np.exp(ln_of(box, [1005.0, 1000.0, 990.0]))
    assert inside == pytest.approx(1.0, abs=2e-6)
    assert end == pytest.approx(0.5, abs=1e-6)
    assert out < 1e-20
    whole = integrate.quad(
        lambda x: float(np.exp(ln_of(box, [x])[0])), 980.0, 1030.0, points=[1000.0, 1010.0]
    )
    assert whole[0] == pytest.approx(10.0, abs=1e-6)


def test_no_number_has_no_likelihood():
    for age in (Age(value=10.0, err_minus=1.0, err_plus=1.0), Age(upper=10.0), Age(lower=10.0)):
        np.testing.assert_array_equal(ln_of(age, [np.nan]), [-np.inf])
    assert ln_of(Age(value=10.0, err_minus=1.0, err_plus=1.0), [np.inf])[0] == -np.inf


def test_each_kind_reads_its_own_quantity():
    one = np.ones(1)
    full = State(1.0 * one, 2.0 * one, 3.0 * one, 4.0 * one, 5.0 * one, 6.0 * one, 7.0 * one)
    found = {name: kind(upper=50.0).predicted(full)[0] for name, kind in MEASUREMENTS.items()}
    assert found == {"age": 1.0, "surface_temperature": 4.0, "thermal_luminosity": 5.0, "obliquity": 6.0}


def test_a_channel_without_an_obliquity_is_judged_by_isotropic_directions():
    """Against the mean over random directions: cos(a) flat."""
    angle = np.degrees(np.arccos(np.random.default_rng(4).random(400_000)))
    for measured in (
        Obliquity(value=20.0, err_minus=5.0, err_plus=8.0),
        Obliquity(upper=30.0),
        Obliquity(lower=50.0, upper=60.0),
    ):
        values = np.exp(ln_of(measured, angle))
        expected, err = values.mean(), values.std() / np.sqrt(angle.size)
        found = np.exp(measured.ln_likelihood(state(age=np.ones(3))))
        assert found.shape == (3,)
        assert found[0] == pytest.approx(expected, abs=4.0 * err)


# --- how surprising -----------------------------------------------------------------------------------------


@pytest.mark.parametrize(("minus", "plus"), ERRORS)
@pytest.mark.parametrize("truth", [28.0, 30.0, 31.5])
def test_the_tail_is_that_of_repetitions(minus, plus, truth):
    """Two-piece draws about the truth: below it with the weight of the upper error."""
    rng = np.random.default_rng(7)
    below = rng.random(400_000) < plus / (minus + plus)
    step = np.abs(rng.standard_normal(below.size))
    repeated = truth + np.where(below, -plus, minus) * step
    side = np.mean(repeated < 30.0)
    expected = 2.0 * min(side, 1.0 - side)
    found = Age(value=30.0, err_minus=minus, err_plus=plus).tail(np.array([truth]), np.ones(1))
    assert found == pytest.approx(expected, abs=5e-3)


def test_the_tail_is_uniform_under_the_truth():
    """Predictions from N(0, 2) about 30 and an error of 1.5: a calibrated tail is uniform, a wrong error's is not."""
    rng = np.random.default_rng(8)
    predictions = 30.0 + 2.0 * rng.standard_normal(4000)
    weights = np.full(4000, 1.0 / 4000)
    observed = 30.0 + np.hypot(2.0, 1.5) * rng.standard_normal(400)

    def tails(error):
        return [Age(value=y, err_minus=error, err_plus=error).tail(predictions, weights) for y in observed]

    assert stats.kstest(tails(1.5), "uniform").pvalue > ALPHA
    assert stats.kstest(tails(4.0), "uniform").pvalue < ALPHA


def test_tails_of_limits():
    x, weights = np.array([10.0, 20.0]), np.array([0.25, 0.75])
    assert Age(upper=15.0).tail(x, weights) == pytest.approx(0.25, abs=1e-3)
    assert Age(lower=15.0).tail(x, weights) == pytest.approx(0.75, abs=1e-3)
    assert Age(lower=5.0, upper=15.0).tail(x, weights) == pytest.approx(0.5, abs=1e-3)
    assert Age(lower=5.0, upper=30.0).tail(x, weights) == 1.0
    assert Age(upper=5.0).tail(x, weights) < 1e-10


# --- the record ---------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("given", "says"),
    [
        ({}, "either a value"),
        ({"value": 1.0, "err_minus": 1.0, "err_plus": 1.0, "upper": 3.0}, "either a value"),
        ({"value": 1.0}, "positive errors"),
        ({"value": 1.0, "err_minus": 0.0, "err_plus": 1.0}, "positive errors"),
        ({"value": -1.0, "err_minus": 1.0, "err_plus": 1.0}, "must be positive"),
        ({"lower": 2.0, "upper": 2.0}, "below the upper"),
        ({"lower": np.inf}, "either a value"),
    ],
)
def test_nonsense_is_refused(given, says):
    with pytest.raises(InputError, match=f"age: .*{says}.*remedy"):
        Age(**given)


def test_an_obliquity_ends_at_90_degrees():
    assert Obliquity(value=0.0, err_minus=5.0, err_plus=5.0).value == 0.0
    with pytest.raises(InputError, match="between 0 and 90 deg"):
        Obliquity(value=120.0, err_minus=5.0, err_plus=5.0)


def test_kinds_differ_when_written_as_dictionaries():
    """The hash of a run is made of those."""
    numbers = {"value": 5.0, "err_minus": 1.0, "err_plus": 1.0}
    assert len({str(asdict(kind(**numbers))) for kind in MEASUREMENTS.values()}) == len(MEASUREMENTS)


@pytest.mark.parametrize(
    ("measurement", "text"),
    [
        (Age(value=2e4, err_minus=1e3, err_plus=1e3), "age 20000 ± 1000 yr"),
        (Age(lower=1000.0, upper=3000.0), "age 1000 to 3000 yr"),
        (SurfaceTemperature(upper=8e5), "surface temperature < 800000 K"),
        (
            ThermalLuminosity(value=3e32, err_minus=1e32, err_plus=2e32),
            "thermal luminosity 3e+32 +2e+32 -1e+32 erg / s",
        ),
        (Obliquity(lower=60.0), "obliquity > 60 deg"),
    ],
)
def test_words(measurement, text):
    assert str(measurement) == text
