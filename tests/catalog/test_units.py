from functools import partial

import numpy as np
import pytest
from astropy import units as u
from astropy.table import Table

from decayinfer.catalog import read_table
from decayinfer.errors import InputError

close = partial(pytest.approx, abs=0)  # the default allows 1e-12, more than most values here


def by_frequency() -> Table:
    return Table(
        {
            "name": ["X"],
            "frequency": [10.0],
            "frequency_derivative": [-1e-12],
            "frequency_second_derivative": [1e-24],
            "frequency_second_derivative_err": [1e-25],
        }
    )


@pytest.mark.parametrize("unit", ["s", "ms", "us", "min", "yr", "1/Hz"])
def test_period_converts(sample, unit):
    sample["period"] = (sample["period"] * u.s).to(unit)
    sample["period_err"] = np.array([1e-9, 1e-9, 1e-9])
    sample["period_err"].unit = u.s
    pulsar = read_table(sample).pulsars[0]
    assert pulsar.period == close(0.1, rel=1e-14)
    assert pulsar.period_err == close(1e-9, rel=1e-14)


def test_period_derivative_converts(sample):
    sample["period_derivative"] = (sample["period_derivative"] * u.one).to("ns/yr")
    assert read_table(sample).pulsars[0].period_derivative == close(1e-14, rel=1e-14)


@pytest.mark.parametrize(
    ("column", "unit"),
    [
        ("frequency", "mHz"),
        ("frequency", "1/d"),
        ("frequency_derivative", "Hz/yr"),
        ("frequency_derivative", "1/s2"),
        ("frequency_second_derivative", "mHz/s2"),
        ("frequency_second_derivative", "1/s3"),
    ],
)
def test_frequencies_convert(column, unit):
    table = by_frequency()
    plain = read_table(table).pulsars[0]
    scale = u.Unit({"frequency": "Hz", "frequency_derivative": "Hz/s"}.get(column, "Hz/s2")).to(unit)
    for name in (column, f"{column}_err"):
        if name in table.colnames:
            table[name] = table[name] * scale
            table[name].unit = unit
    pulsar = read_table(table).pulsars[0]
    assert pulsar.period == close(plain.period, rel=1e-13)
    assert pulsar.period_derivative == close(plain.period_derivative, rel=1e-13)
    assert pulsar.braking_index == close(plain.braking_index, rel=1e-13)
    assert pulsar.braking_index_err_plus == close(plain.braking_index_err_plus, rel=1e-13)


def test_an_error_without_a_unit_has_that_of_its_value(sample):
    sample["period"] = sample["period"] * 1e3
    sample["period"].unit = "ms"
    sample["period_err"] = [0.5, 0.5, 0.5]
    assert read_table(sample).pulsars[0].period_err == close(5e-4)


@pytest.mark.parametrize(
    ("column", "unit"),
    [
        ("period", "m"),
        ("period", "Hz"),
        ("period_err", "K"),
        ("period_derivative", "s"),
        ("braking_index", "yr"),
        ("braking_index_err", "s"),
        ("age", "pc"),
        ("surface_temperature", "yr"),
        ("surface_temperature_err", "s"),
        ("period", "furlong"),
        ("frequency", "rad/s"),
    ],
)
def test_wrong_dimension_is_refused(sample, column, unit):
    sample["frequency"] = [10.0, 4.0, 2.0]
    sample["frequency_derivative"] = [-1e-12, -3.2e-13, -1.6e-13]
    if column not in sample.colnames:
        sample[column] = [1.0, 1.0, 1.0]
    sample[column].unit = u.Unit(unit, parse_strict="silent")
    with pytest.raises(InputError, match=f"column {column}: the unit must be .*'{unit.replace('/', '.*')}'"):
        read_table(sample)


def test_numbers_written_as_text_take_their_unit(sample):
    sample["period"] = ["100", " 250 ", "abc"]
    sample["period"].unit = "ms"
    catalog = read_table(sample)
    assert [p.period for p in catalog.pulsars] == [0.1, 0.25]
    assert catalog.problems[0].got == "abc ms"
