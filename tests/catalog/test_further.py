"""Columns beside spin and index: what is read, and what is set aside without its row."""

from dataclasses import replace
from functools import partial

import numpy as np
import pytest
from astropy import units as u
from astropy.table import Table

from decayinfer.catalog import read_table
from decayinfer.catalog.columns import COLUMNS, value_of
from decayinfer.catalog.further import further_listing
from decayinfer.cooling.registry import load_scenario
from decayinfer.errors import InputError
from decayinfer.inference.settings import FitSettings
from decayinfer.measurements import MEASUREMENTS
from decayinfer.results.draws import fingerprint

close = partial(pytest.approx, abs=0)

GOOD = {"age": 2e4, "surface_temperature": 9e5, "thermal_luminosity": 2e33, "obliquity": 40.0}
UNITS = {
    "age": ("kyr", 1e3),
    "surface_temperature": ("MK", 1e6),
    "thermal_luminosity": ("W", 1e7),
    "obliquity": ("rad", np.degrees(1.0)),
}
FACTS = {
    "data_span": 22.0,
    "glitch_nudot_step": 4e-3,
    "glitch_time_since": 2.5,
    "spin_noise_log10_scale": -24.5,
    "spin_noise_log10_scale_err": 0.3,
}
NOTHING = ["", np.nan, np.ma.masked]


def ignored(catalog, column):
    """One object, one warning about the column, and the flag."""
    (pulsar,), (problem,) = catalog.pulsars, catalog.problems
    assert pulsar.flags == ("value-ignored",)
    assert (problem.severity, problem.column, problem.row, problem.name) == ("warning", column, 1, "X")
    assert problem.rule
    assert problem.remedy
    return problem


def test_every_kind_has_its_columns():
    assert set(GOOD) == set(MEASUREMENTS)
    for name in GOOD:
        ends = ("", "_err", "_err_minus", "_err_plus", "_min", "_max")
        assert {f"{name}{end}" for end in ends} <= set(COLUMNS)
        assert {value_of(f"{name}{end}") for end in ends} == {name}
    assert [value_of(name) for name in FACTS if not name.endswith("_err")] == list(FACTS)[:4]


@pytest.mark.parametrize(("name", "value"), GOOD.items())
def test_a_value_with_its_error(one, name, value):
    catalog = one(**{name: value, f"{name}_err": 0.1 * value})
    (found,) = catalog.pulsars[0].measurements
    assert type(found) is MEASUREMENTS[name]
    assert (found.value, found.err_minus, found.err_plus) == (value, 0.1 * value, 0.1 * value)
    assert catalog.problems == ()
    assert catalog.pulsars[0].flags == ()


@pytest.mark.parametrize(("name", "value"), GOOD.items())
def test_asymmetric_errors(one, name, value):
    sides = {f"{name}_err_minus": 0.1 * value, f"{name}_err_plus": 0.3 * value}
    (found,) = one(**{name: value} | sides).pulsars[0].measurements
    assert (found.err_minus, found.err_plus) == (0.1 * value, 0.3 * value)
    half = {f"{name}_err": 0.2 * value, f"{name}_err_plus": 0.3 * value}
    (found,) = one(**{name: value} | half).pulsars[0].measurements
    assert (found.err_minus, found.err_plus) == (0.2 * value, 0.3 * value)


@pytest.mark.parametrize(("name", "value"), GOOD.items())
def test_limits_and_intervals(one, name, value):
    (found,) = one(**{f"{name}_max": value}).pulsars[0].measurements
    assert found.upper == value
    assert np.isnan(found.lower)
    (found,) = one(**{f"{name}_min": value, f"{name}_err": 0.1 * value}).pulsars[0].measurements
    assert (found.lower, found.err_minus) == (value, 0.1 * value)
    catalog = one(**{f"{name}_min": value, f"{name}_max": 1.5 * value, name: ""})
    (found,) = catalog.pulsars[0].measurements
    assert (found.lower, found.upper) == (value, 1.5 * value)
    assert catalog.problems == ()


@pytest.mark.parametrize("name", GOOD)
def test_units_convert_and_errors_and_limits_follow(sample, name):
    unit, scale = UNITS[name]
    value = GOOD[name] / scale
    for end, factor in (("", 1.0), ("_err", 0.1)):
        sample[f"{name}{end}"] = [factor * value, np.nan, np.nan]
    sample[f"{name}_max"] = [np.nan, value, np.nan]
    sample[name].unit = unit
    first, second, third = (p.measurements for p in read_table(sample).pulsars)
    assert (first[0].value, first[0].err_plus) == (
        close(GOOD[name], rel=1e-12),
        close(0.1 * GOOD[name], rel=1e-12),
    )
    assert second[0].upper == close(GOOD[name], rel=1e-12)
    assert third == ()


@pytest.mark.parametrize("end", ["", "_err", "_err_minus", "_min", "_max"])
@pytest.mark.parametrize(("name", "unit"), [(name, "m") for name in GOOD] + [("obliquity", "yr")])
def test_wrong_dimension_is_refused(sample, name, end, unit):
    sample[f"{name}{end}"] = [1.0, 1.0, 1.0]
    sample[f"{name}{end}"].unit = u.Unit(unit)
    with pytest.raises(InputError, match=f"column {name}{end}: the unit must be"):
        read_table(sample)


@pytest.mark.parametrize("bad", ["x", np.inf, -1.0, 10**400])
@pytest.mark.parametrize("name", GOOD)
def test_a_bad_value_leaves_the_row(one, name, bad):
    catalog = one(**{name: bad, f"{name}_err": 1.0})
    problem = ignored(catalog, name)
    assert "to be used" in problem.rule
    assert catalog.pulsars[0].measurements == ()
    assert catalog.pulsars[0].braking_index == 12.0


@pytest.mark.parametrize("bad", [0.0, -1.0, np.inf, "x"])
def test_a_bad_error_leaves_the_row(one, bad):
    catalog = one(age=1e4, age_err=bad)
    assert [p.column for p in catalog.problems] == ["age_err", "age"]
    assert catalog.problems[1].rule == "must come with its errors to be used"
    assert catalog.pulsars[0].measurements == ()
    assert catalog.pulsars[0].flags == ("value-ignored",)


def test_an_obliquity_beyond_90_degrees(one):
    problem = ignored(one(obliquity=120.0, obliquity_err=5.0), "obliquity")
    assert "between 0 and 90 deg" in problem.rule
    assert one(obliquity=0.0, obliquity_err=5.0).pulsars[0].measurements[0].value == 0.0


def test_a_value_without_an_error(one):
    assert ignored(one(age=1e4), "age").got == "10000.0"
    catalog = one(age=1e4, age_max=2e4)  # the limit still counts
    assert ignored(catalog, "age")
    assert catalog.pulsars[0].measurements[0].upper == 2e4


def test_a_value_comes_before_limits(one):
    catalog = one(age=1e4, age_err=1e3, age_max=3e4)
    ignored(catalog, "age_max")
    assert catalog.pulsars[0].measurements[0].value == 1e4


def test_limits_that_cross(one):
    catalog = one(age_min=3e4, age_max=1e4)
    assert ignored(catalog, "age_max").rule == "must be above age_min to be used"
    assert catalog.pulsars[0].measurements == ()


def test_an_error_of_nothing(one):
    ignored(one(age_err=1e3), "age_err")


@pytest.mark.parametrize("cell", NOTHING)
def test_blank_cells_say_nothing(one, cell):
    names = [name for kind in MEASUREMENTS.values() for name in kind.columns()]
    catalog = one(**dict.fromkeys([*names, *FACTS], cell), index_kind="")
    assert catalog.problems == ()
    assert catalog.pulsars[0].measurements == ()
    assert catalog.pulsars[0].further() == ()


def test_facts(one):
    (pulsar,) = one(**FACTS).pulsars
    assert {name: getattr(pulsar, name) for name in FACTS} == FACTS
    assert pulsar.flags == ()
    assert all(np.isnan(getattr(one().pulsars[0], name)) for name in FACTS)


def test_units_of_facts(sample):
    sample["data_span"] = [8035.5] * 3
    sample["data_span"].unit = "d"
    sample["glitch_time_since"] = [24.0] * 3
    sample["glitch_time_since"].unit = "h"
    pulsar = read_table(sample).pulsars[0]
    assert pulsar.data_span == close(22.0, rel=1e-12)
    assert pulsar.glitch_time_since == close(1.0 / 365.25, rel=1e-12)
    sample["glitch_nudot_step"] = [1.0] * 3
    sample["glitch_nudot_step"].unit = "Hz/s"
    with pytest.raises(InputError, match="must be dimensionless"):
        read_table(sample)


@pytest.mark.parametrize("name", FACTS)
@pytest.mark.parametrize("bad", ["x", np.inf, 0.0, -100.0])
def test_bad_facts_leave_the_row(one, name, bad):
    catalog = one(**FACTS | {name: bad})
    ignored(catalog, name)
    assert np.isnan(getattr(catalog.pulsars[0], name))
    others = [other for other in FACTS if other != name]
    assert [getattr(catalog.pulsars[0], other) for other in others] == [FACTS[other] for other in others]


def test_a_noise_scale_must_be_a_logarithm(one):
    assert "log10" in ignored(one(spin_noise_log10_scale=3e-25), "spin_noise_log10_scale").rule


@pytest.mark.parametrize(
    ("word", "kind"),
    [
        ("interglitch", "interglitch"),
        ("Inter-Glitch", "interglitch"),
        ("long term", "long-term"),
        ("", ""),
        ("-", ""),
    ],
)
def test_kind_of_index(one, word, kind):
    catalog = one(index_kind=word)
    assert catalog.pulsars[0].index_kind == kind
    assert catalog.problems == ()


@pytest.mark.parametrize("word", ["yearly", 3, True, "long\nterm glitch"])
def test_an_unknown_kind_of_index(one, word):
    catalog = one(index_kind=word)
    problem = ignored(catalog, "index_kind")
    assert "interglitch or long-term" in problem.rule
    assert str(problem).isprintable()
    assert catalog.pulsars[0].index_kind == ""


def test_columns_can_be_mapped(sample):
    sample["t_snr"] = [1e4, 2e4, 3e4]
    sample["t_low"] = ["", "x", "1e3"]
    sample["how"] = ["long-term"] * 3
    columns = {"age_max": "t_snr", "age_min": "t_low", "index_kind": "how"}
    catalog = read_table(sample, columns=columns)
    assert [p.measurements[0].upper for p in catalog.pulsars] == [1e4, 2e4, 3e4]
    assert [p.index_kind for p in catalog.pulsars] == ["long-term"] * 3
    (problem,) = catalog.problems
    assert (problem.row, problem.column) == (2, "t_low")


def test_truths_of_an_invented_sample_are_no_misspelling(sample):
    sample["truth_glitch_nudot_step"] = [1e-3] * 3
    assert read_table(sample).problems == ()
    sample.rename_column("truth_glitch_nudot_step", "glitch_nudott_step")
    assert [p.column for p in read_table(sample).problems] == ["glitch_nudott_step"]


def test_a_file_holds_them_too(tmp_path):
    header = (
        "name,period,period_derivative,braking_index,braking_index_err,age,age_err,obliquity_max,index_kind\n"
    )
    (tmp_path / "t.csv").write_text(header + "A,0.1,1e-14,12,1,9e3,1e3,,long-term\nB,0.1,1e-14,12,1,,,60,\n")
    first, second = read_table(tmp_path / "t.csv").pulsars
    assert first.further() == ("age 9000 ± 1000 yr", "long-term index")
    assert second.further() == ("obliquity < 60 deg",)


def test_listing_names_those_of_which_more_is_known(sample):
    sample["age"], sample["age_err"] = [np.nan, 2e4, np.nan], [np.nan, 1e3, np.nan]
    sample["data_span"] = ["", "", "20"]
    assert further_listing(read_table(sample)) == [("X2", "age 20000 ± 1000 yr"), ("X3", "data span 20 yr")]


def test_the_run_s_fingerprint_sees_every_one(one):
    """A posterior run kept in a folder is fitted again when any of them changes."""
    scenario, settings = load_scenario("candle"), FitSettings()

    def of(**cells):
        return fingerprint(one(**cells).pulsars[0], settings, scenario)

    prints = [of()]
    for name, value in GOOD.items():
        prints.append(of(**{name: value, f"{name}_err": 0.1 * value}))
        prints.append(of(**{name: value, f"{name}_err": 0.2 * value}))
        prints.append(of(**{f"{name}_max": value}))
    for name, value in FACTS.items():
        prints.append(of(**{name: value}))
    prints.append(of(index_kind="long-term"))
    assert len(set(prints)) == len(prints)
    assert of(age=2e4, age_err=1e3) == of(age=2e4, age_err=1e3)
    pulsar = one(age=5.0, age_err=1.0).pulsars[0]
    other = one(surface_temperature=5.0, surface_temperature_err=1.0).pulsars[0]
    assert fingerprint(pulsar, settings, scenario) != fingerprint(
        replace(pulsar, measurements=other.measurements), settings, scenario
    )


def test_ten_thousand_rows_with_everything_wrong():
    n_row = 10_000
    names = [name for kind in MEASUREMENTS.values() for name in kind.columns()]
    usual = {
        "name": [f"X{i}" for i in range(n_row)], "period": [0.1] * n_row, "period_derivative": [1e-14] * n_row,
        "braking_index": [12.0] * n_row, "braking_index_err": [1.0] * n_row,
    }  # fmt: skip
    catalog = read_table(Table(usual | {name: [-1.0] * n_row for name in [*names, *FACTS]}))
    assert len(catalog) == n_row
    assert {p.flags for p in catalog.pulsars} == {("value-ignored",)}
