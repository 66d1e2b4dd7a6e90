"""Write the pages and figures of this folder from the scenarios that ship.

    python docs/cooling/make.py

needs matplotlib, which ``pip install 'decayinfer[docs]'`` brings, and about two minutes: the cards hold every fit
against the solver.
"""

from pathlib import Path

import numpy as np
from cards import card, draw, solve, t_b
from drawing import AGE, COLOURS, error_text, new, save
from surface import surface_figure, surface_page

from decayinfer.cooling.recipes import SUPERFLUIDITY
from decayinfer.cooling.registry import load_scenario, scenario_names, standard_names
from decayinfer.cooling.scenario import Scenario

FOLDER = Path(__file__).parent
MASSES = {1.1: "-", 1.4: "--", 1.8: ":"}  # M_sun, and the line of each

HEAD = """\
# Cooling scenarios

A scenario gives the temperature T_b at the base of the envelope as a function of age and mass, and the radius
and moment of inertia of the star. The computed ones are solved from an equation of state up and fitted by one
closed form (`python -m decayinfer.cooling.build`); `decayinfer cooling` lists them, and `decayinfer cooling NAME`
shows one. This page, the card of every scenario behind its name below, and
[surface temperatures of real stars](surface_temperature.md) are made by `python docs/cooling/make.py`.

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
- Posteriors were compared with those under the solver itself, for three invented objects in every scenario
  (`tests/studies/fit_against_solver.py`): means move by at most 0.02 posterior standard deviations. With triplet
  pairing they move by up to 0.1, most under `sly4-triplet-iron` (0.11, birth field of a young star); of that the
  quadrature makes less than 0.003.
- Direct Urca opens below 2 M_sun only in BSk24 with the symmetry energies used here.
- The provisional scenarios join published scalings, with no computed cooling curve behind them. They serve
  comparison and are never taken unless named.

## Sources

"""

TABLE = (
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


def figure() -> None:
    """Draw T_b(t) of the standard set."""
    ages = np.geomspace(*AGE, 61)
    canvas, panels = new(2, 2, figsize=(8.4, 6.4), sharex=True, sharey=True)
    for panel, name, colour in zip(panels, standard_names(), COLOURS, strict=True):
        for mass, line in MASSES.items():
            panel.plot(
                ages,
                t_b(load_scenario(name), ages, mass),
                line,
                color=colour,
                lw=1.6,
                label=rf"{mass} M$_\odot$",
            )
        panel.set_title(name, loc="left", fontsize=10)
        panel.set(xscale="log", yscale="log", xlim=AGE, ylim=(3e6, 1e9))
        panel.minorticks_off()
    panels[0].legend(frameon=False, loc="lower left")
    canvas.supxlabel("age t [yr]")
    canvas.supylabel(r"T$_b$ [K]")
    save(canvas, FOLDER / "standard.svg")


def table(scenarios: list[Scenario]) -> str:
    """Return the table of the page."""
    lines = ["| " + " | ".join(TABLE) + " |", "|" + " --- |" * len(TABLE)]
    papers = sources(scenarios)
    for s in scenarios:
        group = "provisional" if s.provisional else "standard" if s.standard else "by name"
        numbers = ", ".join(map(str, sorted(papers.index(source) + 1 for source in s.sources)))
        pairing = SUPERFLUIDITY[s.properties["superfluidity"]][0] if not s.provisional else "not considered"
        physics = (s.properties["eos"], pairing, s.properties["envelope"], s.properties["direct_urca"])
        cells = (f"[`{s.name}`](cards/{s.name}.md)", *physics, group, *error_text(s), numbers)
        lines.append("| " + " | ".join(cells) + " |")
    return "\n".join(lines)


def sources(scenarios: list[Scenario]) -> list[str]:
    """Return every paper once, in order of appearance."""
    return list(dict.fromkeys(source for s in scenarios for source in s.sources))


def page() -> str:
    """Return the index."""
    scenarios = [load_scenario(name) for name in scenario_names()]
    papers = "\n".join(f"{i}. {paper}" for i, paper in enumerate(sources(scenarios), 1))
    return HEAD + table(scenarios) + "\n" + TAIL + papers + "\n"


def main() -> None:
    """Write everything."""
    (FOLDER / "cards").mkdir(exist_ok=True)
    for name in scenario_names():
        scenario, solved = load_scenario(name), solve(name)
        draw(scenario, solved, FOLDER / "cards" / f"{name}.svg")
        (FOLDER / "cards" / f"{name}.md").write_text(card(scenario, solved), encoding="utf-8")
    figure()
    surface_figure(FOLDER / "surface_temperature.svg")
    (FOLDER / "surface_temperature.md").write_text(surface_page(), encoding="utf-8")
    (FOLDER / "index.md").write_text(page(), encoding="utf-8")


if __name__ == "__main__":
    main()
