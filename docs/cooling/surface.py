"""Surface temperatures of real stars over the bands of the scenarios: a check, with its page and figure."""

import csv
from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from drawing import AGE, COLDEST, COLOURS, new, save
from numpy.typing import ArrayLike

from decayinfer.cooling.envelope import surface_temperature
from decayinfer.cooling.form import MASS_RANGE
from decayinfer.cooling.recipes import RECIPES
from decayinfer.cooling.registry import load_scenario, standard_names

__all__ = ["Observed", "bands", "containing", "read_observed", "surface_figure", "surface_page"]

type Masked = np.ma.MaskedArray

TABLE = Path(__file__).parents[2] / "tests" / "data" / "surface_temperatures.csv"
MASSES = np.linspace(*MASS_RANGE, 41)
WITHOUT_URCA = tuple(name for name, recipe in RECIPES.items() if not recipe.direct_urca)
SPREAD = 3.0  #: how far the bar of a characteristic age reaches either way: common practice
CROWDED = "J0835-4510"  #: its name goes below, where there is room

HEAD = """\
# Surface temperatures of real stars

A check of the cooling scenarios against thermal emitters, not an input of any fit.

![T_s against age](surface_temperature.svg)

Effective temperature of the surface against age, as seen from far away (left) and local (right); each star stands
where its paper states the temperature. Coloured: the standard set, 1 to 2 M_sun, T_s from T_b through the
scenario's own envelope at the gravity of each mass. Grey: from the coldest to the hottest star of any computed
scenario; dashed: the coldest without direct Urca. Circles with bars: characteristic ages, and a factor of three
either way. Squares: the age of the remnant. A band ends where its hottest star is colder than 3e6 K
inside, below which the closed forms level off.

"""

TAIL = """
A row lies in a band if its temperature, within the stated error, is that of some mass from 1 to 2 M_sun at the stated
age; for pulsars that is the characteristic age.

## What it shows

"""

READING = """\
So the standard set, which leaves out direct Urca and triplet pairing, lies on the warm side of these stars, Vela
(J0835-4510) and J2337+6151 above all. Faster cooling is one reading: direct Urca in heavy stars reaches all of
them, triplet pairing some; whoever takes it should name such scenarios with `--cooling`. There are others:

- A characteristic age is an age only if the pulsar was born spinning fast and brakes as a dipole, which is what
  this package calls in question; a star older than that has cooled for longer.
- A temperature hangs on the atmosphere assumed: from the same photons a black body gives a higher one than
  hydrogen does, by up to a factor of two (common practice). The magnetic field in the envelope, left out here,
  moves T_s at a given T_b too.
- Emitters whose whole surface was measured are few, and were not chosen at random.

That a star lies in a band does not show that the scenario is right: with direct Urca a band runs from the slow curve
down to the coldest star, and the mass can be chosen to fit."""


@dataclass(frozen=True)
class Observed:
    """A thermal emitter.

    Parameters
    ----------
    name, model, component, source : str
        The star, how its spectrum was read, and the paper.
    age : float [yr]
        Stated age, or else characteristic age.
    dated : bool
        Whether the age is that of the remnant.
    temperature, error : float [MK]
        Of the surface; no error stated counts as none.
    redshifted : bool
        Whether it is as seen from far away; local otherwise.
    """

    name: str
    model: str
    component: str
    source: str
    age: float
    dated: bool
    temperature: float
    error: float
    redshifted: bool


def read_observed() -> list[Observed]:
    """Read the table."""
    with TABLE.open(encoding="utf-8", newline="") as file:
        return [
            Observed(
                name=row["psr"],
                model=row["model"],
                component=row["component"],
                source=row["source"],
                age=float(row["age_yr"] or row["tau_c_yr"]),
                dated=bool(row["age_yr"]),
                temperature=float(row["T_MK"]),
                error=float(row["T_err"] or 0.0),
                redshifted=row["redshifted"] == "yes",
            )
            for row in csv.DictReader(file)
        ]


def bands(name: str, age: ArrayLike, *, redshifted: bool) -> tuple[Masked, Masked]:
    """Return the lowest and highest surface temperature [MK] over the masses of a scenario, at each age [yr].

    Masked where every star is colder than 3e6 K inside.
    """
    scenario = load_scenario(name)
    ages, mass = np.meshgrid(np.atleast_1d(age), MASSES)
    t_b = 1e8 * np.exp(scenario.ln_temperature(np.log(ages), mass))
    t_s = surface_temperature(t_b, scenario.gravity_14(mass), envelope=scenario.properties["envelope"]) / 1e6
    if redshifted:
        t_s = t_s * scenario.redshift_factor(mass)
    cold = t_b.max(axis=0) < COLDEST
    return np.ma.array(t_s.min(axis=0), mask=cold), np.ma.array(t_s.max(axis=0), mask=cold)


def containing(star: Observed, names: Iterable[str], *, spread: float = 1.0) -> list[str]:
    """Return the scenarios in whose band a star lies, its age being free by a factor either way."""
    ages, found = star.age * np.geomspace(1.0 / spread, spread, 21), []
    for name in names:
        low, high = bands(name, ages, redshifted=star.redshifted)
        if low.min() <= star.temperature + star.error and high.max() >= star.temperature - star.error:
            found.append(name)
    return found


def surface_figure(path: Path) -> None:
    """Draw both panels."""
    figure, panels = new(1, 2, figsize=(9.6, 4.6), sharey=True)
    ages = np.geomspace(*AGE, 37)
    for panel, redshifted in zip(panels, (True, False), strict=True):
        every = {name: np.array(bands(name, ages, redshifted=redshifted)) for name in RECIPES}
        low, high = (f([band[k] for band in every.values()], axis=0) for k, f in enumerate((np.min, np.max)))
        panel.fill_between(ages, low, high, color="0.9", lw=0)
        panel.plot(ages, np.min([every[name][0] for name in WITHOUT_URCA], axis=0), "--", color="0.45", lw=1)
        for name, colour in zip(standard_names(), COLOURS, strict=True):
            low, high = bands(name, ages, redshifted=redshifted)
            panel.fill_between(ages, low, high, color=colour, alpha=0.45, lw=0, label=name)
        for star in read_observed():
            if star.redshifted is redshifted:
                _mark(panel, star)
        panel.set(xscale="log", yscale="log", xlim=(250.0, AGE[1]), ylim=(0.17, 7.0), xlabel="age t [yr]")
        panel.set_title("as seen from far away" if redshifted else "local", loc="left", fontsize=10)
        panel.set_yticks([0.2, 0.5, 1, 2, 5], ["0.2", "0.5", "1", "2", "5"])
        panel.minorticks_off()
    panels[0].set_ylabel(r"T$_s$ [MK]")
    panels[1].legend(frameon=False, loc="upper right", fontsize=9)
    save(figure, path)


def _mark(panel, star: Observed) -> None:
    reach = [[0.0], [0.0]] if star.dated else [[star.age * (1 - 1 / SPREAD)], [star.age * (SPREAD - 1)]]
    panel.errorbar(
        [star.age], [star.temperature], yerr=[star.error], xerr=reach,
        fmt="s" if star.dated else "o", color="k", ms=4, lw=1,
    )  # fmt: skip
    if not star.component.endswith("2009"):  # one name for both epochs of a star
        offset = (-45, -13) if star.name == CROWDED else (5, 5)
        panel.annotate(
            star.name, (star.age, star.temperature), offset, textcoords="offset points", fontsize=8
        )


def surface_page() -> str:
    """Return the page."""
    stars = read_observed()
    heads = ("star", "age [yr]", "T_s [MK]", "frame", "spectrum", "in the standard set", "in others", "paper")
    lines = ["| " + " | ".join(heads) + " |", "|" + " --- |" * len(heads)]
    lines += ["| " + " | ".join(_cells(star)) + " |" for star in stars]
    return HEAD + "\n".join(lines) + "\n" + TAIL + _findings(stars) + "\n\n[All scenarios](index.md)\n"


def _cells(star: Observed) -> tuple[str, ...]:
    standard = containing(star, standard_names())
    others = [name for name in containing(star, RECIPES) if name not in standard]
    return (
        star.name,
        f"{star.age:.0f} ({'remnant' if star.dated else 'characteristic'})",
        f"{star.temperature:g}" + (f" +- {star.error:g}" if star.error else " (no error stated)"),
        "far away" if star.redshifted else "local",
        f"{star.model}; {star.component}",
        ", ".join(standard) or "none",
        ", ".join(others) or "none",
        star.source,
    )


def _findings(stars: list[Observed]) -> str:
    old, young = ([star for star in stars if (star.age > 1e3) is side] for side in (True, False))
    every, slow, standard = (
        sum(bool(containing(star, names)) for star in old)
        for names in (RECIPES, WITHOUT_URCA, standard_names())
    )
    outside = [star.name for star in stars if not containing(star, RECIPES)]
    near = [star.name for star in old if containing(star, standard_names(), spread=SPREAD)]
    in_standard = sum(bool(containing(star, standard_names())) for star in young)
    return f"""\
- Of the {len(old)} rows older than 1e3 yr, {every} lie in the band of some computed scenario, {slow} without those \
with direct Urca, {standard} in the standard set. Outside every band: {", ".join(outside) or "none"}.
- With ages free by the factor of three, {len(near)} of the {len(old)} reach the standard set \
({", ".join(near) or "none"}).
- Of the {len(young)} rows at 330 yr, {in_standard} lie in the standard set. The crust has barely relaxed by then, the \
temperature hangs on the carbon atmosphere assumed, and both rows are epochs of one star: agreement there says little.

{READING}"""
