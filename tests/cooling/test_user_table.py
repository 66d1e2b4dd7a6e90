import numpy as np
import pandas as pd
import pytest
from astropy import units as u
from astropy.table import Table

from decayinfer.cooling import user_table
from decayinfer.cooling.registry import load_scenario, register_scenario
from decayinfer.cooling.scenario import read_scenario, write_scenario
from decayinfer.cooling.user_table import scenario_from_table
from decayinfer.errors import InputError

MASSES = (1.0, 1.25, 1.5, 1.75, 2.0)


def temperature(age, mass):
    """An invented history: neutrino era, then photon era."""
    return 2.5e8 * (1.6 - 0.3 * mass) * (age / 1e3) ** (-1 / 6) / (1 + age / 2e5) ** 1.5


def table(masses=MASSES, ages=None):
    ages = np.geomspace(300, 1e7, 25) if ages is None else ages
    age, mass = (a.ravel() for a in np.meshgrid(ages, masses))
    return Table({"age": age * u.yr, "mass": mass * u.M_sun, "temperature": temperature(age, mass) * u.K})


def fit(source, **settings):
    return scenario_from_table(source, name="mine", starts=1, **settings)


@pytest.fixture(scope="module")
def fitted():
    return fit(table())


def test_a_smooth_table_is_followed_between_its_rows(fitted):
    assert fitted.fit_error["temperature"] < 0.01
    for mass in (1.1, 1.4, 1.9):
        age = np.geomspace(1e3, 1e7, 40)
        age = age[temperature(age, mass) > 3e6]  # the form levels off below
        found = 1e8 * np.exp(fitted.ln_temperature(np.log(age), mass))
        assert found == pytest.approx(temperature(age, mass), rel=0.02)


def test_it_becomes_a_scenario_like_the_others(fitted, tmp_path):
    write_scenario(fitted, tmp_path / "mine.toml")
    assert np.array_equal(read_scenario(tmp_path / "mine.toml").table, fitted.table)
    register_scenario(fitted)
    assert load_scenario("mine") is fitted
    assert fitted.radius_km(1.4) == pytest.approx(12.59, rel=0.003)  # BSk24, see test_stars
    assert fitted.inertia_45(1.4) == pytest.approx(1.581, rel=0.005)


def test_every_form_of_the_table_reads_the_same(tmp_path):
    rows = table()
    rows.write(tmp_path / "mine.ecsv")
    rows.write(tmp_path / "mine.csv")
    frame = pd.DataFrame({name: np.asarray(rows[name]) for name in rows.colnames})
    curves = {m: (rows["age"][rows["mass"] == m], rows["temperature"][rows["mass"] == m]) for m in MASSES}
    seconds = rows.copy()
    seconds["age"] = seconds["age"].to(u.s)
    renamed = rows.copy()
    renamed.rename_column("age", "t")
    expected = user_table._read(rows, {})
    for source, columns in (
        (tmp_path / "mine.ecsv", {}),
        (str(tmp_path / "mine.csv"), {}),
        (frame, {}),
        (curves, {}),
        (seconds, {}),
        (renamed, {"age": "t"}),
    ):
        read = user_table._read(source, columns)
        for mass in MASSES:
            assert np.array(read.curve(mass)[1:]) == pytest.approx(np.array(expected.curve(mass)[1:]))


def test_redshifted_temperatures_are_brought_to_the_star(fitted):
    rows = table()
    rows["temperature"] = rows["temperature"] * fitted.redshift_factor(np.asarray(rows["mass"]))
    local = fit(rows, redshifted=True)
    for age in (1e3, 1e5):
        expected = fitted.ln_temperature(np.log(age), 1.4)
        assert local.ln_temperature(np.log(age), 1.4) == pytest.approx(expected, abs=0.01)


def changed(row, column, value):
    rows = table()
    rows[column][row] = value
    return rows


@pytest.mark.parametrize(
    ("source", "words"),
    [
        (lambda: changed(30, "temperature", 1e9), r"rows 30 and 31: temperature must fall .* 1\.25 M_sun"),
        (lambda: changed(7, "temperature", np.nan), "row 8, column temperature"),
        (lambda: changed(7, "age", -3.0), "row 8, column age"),
        (lambda: table(ages=np.geomspace(300, 1e7, 8)), "too sparse at 1 M_sun: 8 ages"),
        (
            lambda: table(ages=np.r_[np.geomspace(300, 1e4, 12), np.geomspace(1e5, 1e7, 12)]),
            "nothing between",
        ),
        (lambda: table(ages=np.geomspace(2e3, 1e7, 25)), "start at 1e3 yr or earlier"),
        (lambda: table(ages=np.geomspace(300, 1e5, 25)), "go on to 1e6 yr"),
        (lambda: table(masses=(1.0, 2.0)), "too few masses"),
        (lambda: table(masses=(1.0, 1.2, 1.4)), "at least 1.8"),
        (lambda: table(masses=(1.0, 1.2, 1.9)), "neighbours may differ"),
        (lambda: table()["age", "mass"], "no column 'temperature'"),
        (lambda: {1.4: ([1, 2, 3], [1, 2])}, "3 ages but 2 temperatures"),
        (lambda: "nowhere.csv", "cannot be read"),
    ],
)
def test_unusable_tables_are_refused_with_the_reason(source, words):
    with pytest.raises(InputError, match=words):
        fit(source())


def test_a_table_that_the_form_cannot_follow_is_refused():
    rows = table(masses=np.linspace(1, 2, 11))
    heavy = np.asarray(rows["mass"]) % 0.2 < 0.1  # temperature jumps up and down from mass to mass
    rows["temperature"][heavy] *= 0.3
    with pytest.raises(InputError, match=r"misses this table by .* row \d+"):
        fit(rows)
