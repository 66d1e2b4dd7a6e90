"""The card of a scenario: its physics, its stars, its fit against the solver, and a figure of both."""

from dataclasses import dataclass
from pathlib import Path

import numpy as np
from drawing import AGE, COLDEST, COLOURS, error_text, new, save
from numpy.typing import NDArray

from decayinfer.cooling.envelope import surface_temperature
from decayinfer.cooling.eos import get_eos
from decayinfer.cooling.evolution import CoolingCurve, cool, interior
from decayinfer.cooling.matter import SYMMETRY_ENERGIES, beta_equilibrium, direct_urca_mass
from decayinfer.cooling.recipes import RECIPES, SUPERFLUIDITY
from decayinfer.cooling.scenario import Scenario
from decayinfer.cooling.stars import Star, maximum_mass_star, stars_of_mass
from decayinfer.cooling.superfluidity import CRITICAL_TEMPERATURES

__all__ = ["card", "draw"]

type Array = NDArray[np.float64]

MASSES = (1.05, 1.35, 1.65, 1.95)  #: midway between masses of the fits [M_sun]
SOLVED = np.geomspace(350.0, 9.5e6, 25)  #: ages at which the solver is asked, not those of the fits [yr]
TABLED = (1e3, 1e4, 1e5, 1e6)  #: ages of the table of temperatures [yr]
ENVELOPES = {"iron": "iron", "light": "light elements, fully accreted"}


@dataclass(frozen=True)
class Solved:
    """Stars of `MASSES` and their solved histories; empty for a provisional scenario."""

    stars: tuple[Star, ...] = ()
    curves: tuple[CoolingCurve, ...] = ()


def solve(name: str) -> Solved:
    """Solve the stars of a computed scenario."""
    if name not in RECIPES:
        return Solved()
    recipe = RECIPES[name]
    stars = stars_of_mass(get_eos(recipe.eos), MASSES)
    curves = (cool(interior(star, recipe.physics), SOLVED, envelope=recipe.envelope) for star in stars)
    return Solved(tuple(stars), tuple(curves))


def draw(scenario: Scenario, solved: Solved, path: Path) -> None:
    """Draw T_b against age, and below it how far the fit is from the solver."""
    figure, panels = new(
        2 if solved.curves else 1, 1, figsize=(6.4, 5.4 if solved.curves else 4.2), sharex=True,
        **({"height_ratios": (3, 1)} if solved.curves else {}),
    )  # fmt: skip
    ages = np.geomspace(*AGE, 91)
    for k, mass in enumerate(MASSES):
        panels[0].plot(ages, t_b(scenario, ages, mass), color=COLOURS[k], lw=1.4, label=rf"{mass} M$_\odot$")
        if solved.curves:
            points = _warm(np.exp(solved.curves[k].ln_t_b) * 1e8)
            miss = 100.0 * (t_b(scenario, SOLVED, mass) / points - 1.0)
            panels[0].plot(SOLVED, points, "o", color=COLOURS[k], ms=3.5, mfc="none", mew=0.8)
            panels[1].plot(SOLVED, miss, color=COLOURS[k], lw=1.2)
    panels[0].axhspan(1e6, COLDEST, color="0.93", lw=0)
    panels[0].set(xscale="log", yscale="log", xlim=AGE, ylim=(2e6, 1.2e9), ylabel=r"T$_b$ [K]")
    panels[0].legend(frameon=False, loc="upper right", ncols=2)
    if solved.curves:
        panels[0].tick_params(axis="x", which="minor", bottom=False)
        panels[1].axhline(0.0, color="0.5", lw=0.6)
        panels[1].axvline(1e3, color="0.5", lw=0.8, ls=":")
        largest = max(abs(value) for value in panels[1].get_ylim())
        panels[1].set(ylabel="fit/solver - 1 [%]", ylim=(-largest, largest))
    panels[-1].set_xlabel("age t [yr]")
    save(figure, path)


def t_b(scenario: Scenario, age: Array, mass: float) -> Array:
    """Return T_b [K] of the fit."""
    return np.asarray(1e8 * np.exp(scenario.ln_temperature(np.log(age), mass)))


def _warm(temperature: Array) -> Array:
    return np.where(temperature >= COLDEST, temperature, np.nan)


def card(scenario: Scenario, solved: Solved) -> str:
    """Return the page."""
    parts = [
        f"# {scenario.name}",
        scenario.description,
        f"![T_b against age]({scenario.name}.svg)",
        _caption(solved),
        "## Physics",
        _physics(scenario),
        "## Stars",
        _star_table(scenario, solved),
        "## Temperatures",
        "T_b in 1e8 K, local, at the base of the envelope; in brackets the effective temperature of the surface as\n"
        "seen from far away, in 1e6 K.",
        _temperature_table(scenario),
        "## How well the closed form follows, and where it is valid",
        _validity(scenario),
        "## Sources",
        "\n".join(f"- {source}" for source in scenario.sources),
        "[All scenarios](../index.md)",
    ]
    return "\n\n".join(parts) + "\n"


def _caption(solved: Solved) -> str:
    if not solved.curves:
        return "T_b(t) of the closed form. There is no solver behind it: it joins published scalings."
    return (
        "Lines: the closed form that the inference uses. Circles: the solver, at masses and ages that the fit has not\n"
        "seen. Below: their difference; errors are stated from the dotted line on. Grey: colder than 3e6 K, where the\n"
        "closed form levels off on purpose."
    )


def _physics(scenario: Scenario) -> str:
    made_of = scenario.properties
    if scenario.name not in RECIPES:
        rows = {
            "equation of state": "none; every star has a radius of 12 km",
            "pairing": "not considered",
            "neutrino cooling": "standard candle, T falling as t^(-1/6), times the factor that the title names",
        }
    else:
        recipe, eos = RECIPES[scenario.name], get_eos(made_of["eos"])
        symmetry, top = SYMMETRY_ENERGIES[eos.name], maximum_mass_star(eos)
        urca = ", direct Urca" if recipe.direct_urca else ""
        rows = {
            "equation of state": f"{eos.name} ({eos.source}); maximum mass {top.mass:.2f} M_sun at {top.radius:.1f} km",
            "composition": f"n, p, e, mu in beta equilibrium; symmetry energy {symmetry.at_saturation:g} MeV "
            f"(n/0.16 fm^-3)^{symmetry.exponent:g} ({symmetry.source})",
            "pairing": SUPERFLUIDITY[recipe.superfluidity][0] + _profiles(recipe.superfluidity),
            "direct Urca": _direct_urca(recipe.direct_urca, direct_urca_mass(eos, symmetry)),
            "neutrino cooling": "modified Urca, nucleon bremsstrahlung, Cooper pairs" + urca,
        }
    rows["envelope"] = ENVELOPES[made_of["envelope"]]
    return _table(("", ""), [*rows.items()])


def _profiles(superfluidity: str) -> str:
    """Describe the critical temperatures of a superfluid model."""
    words = ""
    for species, name in zip(("protons", "neutrons"), SUPERFLUIDITY[superfluidity][1:], strict=True):
        if name:
            t = CRITICAL_TEMPERATURES[name]
            kind = "singlet" if t.pairing == "A" else "triplet"
            words += f"; {species} {kind}, T_c up to {t.peak / 1e9:g}e9 K, "
            words += f"at Fermi wave numbers of {t.k_0:g} to {t.k_2:g} fm^-1 ({t.source})"
    return words


def _direct_urca(acts: bool, threshold: float) -> str:
    if not np.isfinite(threshold):
        return "closed in every star"
    if acts:
        return f"opens in the centre of stars above {threshold:.2f} M_sun"
    return f"left out, though the composition would open it above {threshold:.2f} M_sun"


def _star_table(scenario: Scenario, solved: Solved) -> str:
    heads = ["M [M_sun]", "R [km]", "I [1e45 g cm^2]", "g [1e14 cm/s^2]", "(1 - 2GM/Rc^2)^(1/2)"]
    rows = [
        [f"{m:.2f}", *(f"{f(m):.{d}f}" for f, d in (
            (scenario.radius_km, 2), (scenario.inertia_45, 2), (scenario.gravity_14, 2), (scenario.redshift_factor, 3)
        ))]
        for m in MASSES
    ]  # fmt: skip
    _, *profiles = SUPERFLUIDITY.get(scenario.properties["superfluidity"], ("", None, None))
    for species, profile in zip("pn", profiles, strict=True):
        if profile and solved.stars:
            heads.append(f"T_c of {'protons' if species == 'p' else 'neutrons'} in the centre [1e9 K]")
            for row, star in zip(rows, solved.stars, strict=True):
                row.append(f"{_central_critical_temperature(star, species, profile) / 1e9:.2f}")
    return _table(heads, rows)


def _central_critical_temperature(star: Star, species: str, profile: str) -> float:
    matter = beta_equilibrium(star.core()[0][:1], SYMMETRY_ENERGIES[star.eos.name])
    return float(CRITICAL_TEMPERATURES[profile](matter.k_p if species == "p" else matter.k_n)[0])


def _temperature_table(scenario: Scenario) -> str:
    rows, envelope = [], scenario.properties["envelope"]
    for mass in MASSES:
        local = t_b(scenario, np.array(TABLED), mass)
        surface = surface_temperature(local, scenario.gravity_14(mass), envelope=envelope)
        far = surface * scenario.redshift_factor(mass)
        cells = (
            f"{b / 1e8:.3g} ({s / 1e6:.2f})" if b >= COLDEST else "below 3e6 K"
            for b, s in zip(local, far, strict=True)
        )
        rows.append((f"{mass:.2f}", *cells))
    return _table(("M [M_sun]", *(f"{age:.0e} yr".replace("e+0", "e") for age in TABLED)), rows)


def _validity(scenario: Scenario) -> str:
    if scenario.provisional:
        return (
            "- Nothing was computed and nothing fitted, so there is no fit error.\n"
            "- It serves comparison, and is never taken unless named."
        )
    temperature, slope = error_text(scenario)
    found = scenario.fit_error
    lines = [
        f"- Largest error of T_b at masses and ages left out of the fit, 1e3 to 1e7 yr, T_b >= 3e6 K: {temperature}.",
        f"- Largest error of d ln T_b/d ln t, T_b >= 1e7 K: {slope}.",
        f"- Largest errors of R and I, 1 to 2 M_sun: {found['radius']:.2%} and {found['inertia']:.2%}.",
        "- From 300 yr, once crust and core have one temperature, to 1e7 yr; 1 to 2 M_sun; T_b >= 3e6 K.",
        "- No magnetic field in the envelope, no internal heating, no accretion; effective nucleon masses 0.7.",
    ]
    if "slope_young" in found:
        lines[1] = lines[1].replace("T_b >= 1e7 K", "T_b >= 1e7 K and t >= 1e4 yr")
        lines.append(
            "- Pair emission sets in within a tenth of ln t, faster than the quadrature of field histories follows:\n"
            "  ages and birth fields carry an error of up to half a per cent."
        )
    if "temperature_away" in found:
        lines.append("- Near the threshold means within 0.1 M_sun of the mass at which direct Urca opens.")
    return "\n".join(lines)


def _table(heads: list[str] | tuple[str, ...], rows: list) -> str:
    lines = [heads, ["---"] * len(heads), *rows]
    return "\n".join("| " + " | ".join(line) + " |" for line in lines)
