"""Write the page and the figure of this folder from the scenarios that ship.

    python docs/cooling/make.py

needs matplotlib, which ``pip install 'decayinfer[docs]'`` brings.
"""

from pathlib import Path

import numpy as np

from decayinfer.cooling.recipes import SUPERFLUIDITY
from decayinfer.cooling.registry import load_scenario, scenario_names, standard_names
from decayinfer.cooling.scenario import Scenario

FOLDER = Path(__file__).parent
MASSES = {1.1: "-", 1.4: "--", 1.8: ":"}  # M_sun, and the line of each
COLOURS = ("#1b6f6a", "#c2571a", "#6d4a9c", "#3f3f3f")

HEAD = """\
# Cooling scenarios

A scenario gives the temperature T_b at the base of the envelope as a function of age and mass, and the radius
and moment of inertia of the star. The computed ones are solved from an equation of state up and fitted by one
closed form (`python -m decayinfer.cooling.build`); `decayinfer cooling` lists them, and `decayinfer cooling NAME`
shows one. This page is made by `python docs/cooling/make.py`.

A fit without `--cooling` takes the *standard* set; `--cooling` takes a list of names, or `all` for every
computed scenario, or the path of your own table with columns `age` [yr], `mass` [M_sun] and `temperature` [K]
(local, at the base of the envelope; from 1e3 yr or earlier to 1e6 yr or 3e6 K, three masses or more from 1.2
M_sun or less to 1.8 M_sun or more). Your table becomes a scenario named after the file, with the star of BSk24;
a table that rises, is too sparse or is missed by more than 5 % is refused with the reason.

![T_b against age](standard.svg)

T_b(t) of the standard set at 1.1, 1.4 and 1.8 M_sun. Without pairing and with proton pairing to the centre,
light stars are hotter inside; where proton pairing fades at high density, heavy stars come close to those
without any.

## What they are made of and how well the closed form follows

Errors are the largest found at ages and masses left out of the fit: of T_b from 1e3 to 1e7 yr where T_b >= 3e6
K, of d ln T_b/d ln t where T_b >= 1e7 K (with triplet pairing from 1e4 yr). Near the direct-Urca threshold
means within 0.1 M_sun.

"""

TAIL = """
## Where they are valid

- From 300 yr, once the crust has relaxed, to 1e7 yr, for 1 to 2 M_sun and down to 3e6 K, below which the closed
  form levels off.
- Isothermal interiors, no internal heating, no accretion; effective nucleon masses 0.7.
- Neutron triplet pairing sets in within a tenth of ln t. The quadrature of field histories does not resolve
  that: with the triplet scenarios, ages and birth fields carry an error of up to half a per cent (everywhere
  else below 1e-6), which is less than that of their temperature fits. They are not in the standard set.
- Direct Urca opens below 2 M_sun only in BSk24 with the symmetry energies used here.
- The provisional scenarios join published scalings, with no computed cooling curve behind them. They serve
  comparison and are never taken unless named.

## Sources

"""


def figure() -> None:
    """Draw T_b(t) of the standard set."""
    import matplotlib as mpl

    mpl.use("svg")
    import matplotlib.pyplot as plt

    ages = np.geomspace(300.0, 1e7, 181)
    mpl.rcParams |= {"svg.hashsalt": "decayinfer", "font.size": 10}
    canvas, panels = plt.subplots(2, 2, figsize=(8.4, 6.4), sharex=True, sharey=True, layout="constrained")
    for panel, name, colour in zip(panels.flat, standard_names(), COLOURS, strict=True):
        scenario = load_scenario(name)
        for mass, line in MASSES.items():
            temperature = 1e8 * np.exp(scenario.ln_temperature(np.log(ages), mass))
            panel.loglog(ages, temperature, line, color=colour, lw=1.6, label=rf"{mass} M$_\odot$")
        panel.set_title(name, loc="left", fontsize=10)
        panel.grid(alpha=0.25, lw=0.5)
        panel.legend(frameon=False, loc="lower left")
    panels[0, 0].set(xlim=(300.0, 1e7), ylim=(3e6, 1e9))
    canvas.supxlabel("age t [yr]")
    canvas.supylabel(r"T$_b$ [K]")
    canvas.savefig(FOLDER / "standard.svg", metadata={"Date": None})


def table(scenarios: list[Scenario]) -> str:
    """Return the table of the page."""
    heads = (
        "name",
        "EOS",
        "pairing",
        "envelope",
        "direct Urca",
        "set",
        "error of T_b",
        "error of slope",
        "sources",
    )
    lines = ["| " + " | ".join(heads) + " |", "|" + " --- |" * len(heads)]
    papers = sources(scenarios)
    for s in scenarios:
        group = "provisional" if s.provisional else "standard" if s.standard else "by name"
        numbers = ", ".join(map(str, sorted(papers.index(source) + 1 for source in s.sources)))
        pairing = SUPERFLUIDITY.get(s.properties["superfluidity"], ("not considered",))[0]
        physics = (s.properties["eos"], pairing, s.properties["envelope"], s.properties["direct_urca"])
        lines.append("| " + " | ".join((f"`{s.name}`", *physics, group, *errors(s), numbers)) + " |")
    return "\n".join(lines)


def errors(scenario: Scenario) -> tuple[str, str]:
    """Return the errors of T_b and of the slope."""
    found = scenario.fit_error
    if not found:
        return "-", "-"
    temperature, slope = f"{found['temperature']:.2%}", f"{found['slope']:.3f}"
    if "temperature_away" in found:
        near, away = found["temperature_near_threshold"], found["temperature_away"]
        temperature = f"{away:.2%}; near the threshold {near:.2%}"
    if "slope_young" in found:
        slope += f"; from 1e3 yr {found['slope_young']:.3f}"
    return temperature, slope


def sources(scenarios: list[Scenario]) -> list[str]:
    """Return every paper once, in order of appearance."""
    return list(dict.fromkeys(source for s in scenarios for source in s.sources))


def page() -> str:
    """Return the page."""
    scenarios = [load_scenario(name) for name in scenario_names()]
    papers = "\n".join(f"{i}. {paper}" for i, paper in enumerate(sources(scenarios), 1))
    return HEAD + table(scenarios) + "\n" + TAIL + papers + "\n"


def main() -> None:
    """Write both files."""
    (FOLDER / "index.md").write_text(page(), encoding="utf-8")
    figure()


if __name__ == "__main__":
    main()
