"""What each computed scenario is made of: equation of state, superfluidity, envelope, direct Urca."""

from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType

from decayinfer.cooling.eos import get_eos
from decayinfer.cooling.evolution import Microphysics

__all__ = ["RECIPES", "STANDARD", "SUPERFLUIDITY", "Recipe"]

#: Superfluid models: label, words for the reader, proton and neutron profile of the critical temperature.
SUPERFLUIDITY: Mapping[str, tuple[str, str | None, str | None]] = MappingProxyType(
    {
        "normal": ("no superfluidity", None, None),
        "protons": ("strong proton pairing to the centre", "protons-strong", None),
        "fading": ("strong proton pairing that fades at high density", "protons-closing", None),
        "triplet": (
            "strong proton and moderate neutron triplet pairing",
            "protons-strong",
            "neutrons-moderate",
        ),
    }
)

_PAPERS = {
    "stars": "Hartle 1967, ApJ 150, 1005",
    "emission": "Yakovlev, Kaminker, Gnedin & Haensel 2001, Phys. Rep. 354, 1",
    "capacity": "Yakovlev, Levenfish & Shibanov 1999, Phys. Usp. 42, 737",
    "pairing": "Kaminker, Haensel & Yakovlev 2001, A&A 373, L17",
    "triplet": "Page et al. 2011, PRL 106, 081101",
    "quenching": "Leinson 2010, PRC 81, 025501",
    "threshold": "Beznogov & Yakovlev 2015, MNRAS 452, 540",
    "envelope": "Potekhin, Chabrier & Yakovlev 1997, A&A 323, 415",
}


@dataclass(frozen=True)
class Recipe:
    """One computed scenario.

    Parameters
    ----------
    eos : str
        Name of the equation of state.
    superfluidity : str
        One of `SUPERFLUIDITY`.
    envelope : str
        One of ``envelope.ENVELOPES``.
    direct_urca : bool
        Whether direct Urca acts.
    """

    eos: str
    superfluidity: str
    envelope: str
    direct_urca: bool = False

    @property
    def name(self) -> str:
        """Registry name."""
        parts = [self.eos.lower(), self.superfluidity, self.envelope]
        return "-".join([*parts, "urca"] if self.direct_urca else parts)

    @property
    def physics(self) -> Microphysics:
        """What the matter does."""
        _, protons, neutrons = SUPERFLUIDITY[self.superfluidity]
        return Microphysics(protons=protons, neutrons=neutrons, direct_urca=self.direct_urca)

    @property
    def title(self) -> str:
        """Short title."""
        urca = "direct Urca" if self.direct_urca else "no direct Urca"
        return f"{self.eos}, {SUPERFLUIDITY[self.superfluidity][0]}, {self.envelope} envelope, {urca}"

    @property
    def description(self) -> str:
        """The physics in a few sentences."""
        envelope = {"iron": "an iron envelope", "light": "a fully accreted envelope of light elements"}
        loss = "direct Urca where its threshold is open, " if self.direct_urca else ""
        return (
            f"Isothermal cooling of {self.eos} stars with {SUPERFLUIDITY[self.superfluidity][0]} "
            f"behind {envelope[self.envelope]}; {loss}modified Urca, nucleon bremsstrahlung and Cooper-pair "
            "emission, effective nucleon masses 0.7. Solved from the equation of state up and fitted by the "
            "closed form; good from 300 yr, once the crust has relaxed, to 1e7 yr and down to 3e6 K."
        )

    @property
    def sources(self) -> tuple[str, ...]:
        """The papers the scenario rests on."""
        keys = ["stars", "emission", "capacity"]
        keys += ["pairing"] if self.superfluidity != "normal" else []
        keys += ["triplet", "quenching"] if self.superfluidity == "triplet" else []
        keys += ["threshold"] if self.direct_urca else []
        return (get_eos(self.eos).source, *(_PAPERS[key] for key in (*keys, "envelope")))


def _all() -> tuple[Recipe, ...]:
    plain = [
        Recipe(eos, superfluidity, envelope)
        for eos in ("APR4", "BSk24", "SLy4")
        for superfluidity in SUPERFLUIDITY
        for envelope in ("iron", "light")
    ]
    # only BSk24 opens direct Urca below 2 M_sun with the symmetry energies used here
    urca = [Recipe("BSk24", s, e, direct_urca=True) for s in ("normal", "protons") for e in ("iron", "light")]
    return (*plain, *urca)


#: Every computed scenario, by name.
RECIPES: Mapping[str, Recipe] = MappingProxyType({recipe.name: recipe for recipe in _all()})

#: What is fitted when nothing is asked for: the span of cooling, without pairing, with lasting or fading proton
#: pairing, and with another equation of state and envelope. Triplet pairing is left out because it sets in within a
#: tenth of ln t, faster than the quadrature of field histories follows (half a per cent in age and birth field); direct
#: Urca because only the heaviest stars have it.
STANDARD = ("bsk24-normal-iron", "bsk24-protons-iron", "bsk24-fading-iron", "sly4-protons-light")
