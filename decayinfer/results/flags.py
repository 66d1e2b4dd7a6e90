"""The flags that tables carry: one registry for tables, verdicts and documentation."""

from collections.abc import Iterable
from dataclasses import dataclass

from decayinfer.errors import UnknownNameError

__all__ = ["FLAGS", "Flag", "describe", "join_flags", "split_flags", "warns"]


@dataclass(frozen=True)
class Flag:
    """A flag and what to make of it.

    Attributes
    ----------
    name : str
        The word in the tables.
    meaning : str
        What was found, in a sentence.
    remedy : str
        What to do about it, in a sentence.
    warns : bool
        Whether a posterior run that carries it lends it to its object.
    """

    name: str
    meaning: str
    remedy: str
    warns: bool = True


#: Every flag, by name, in the order in which tables list them.
FLAGS = {
    flag.name: flag
    for flag in (
        Flag(
            "no-channel",
            "Every fitted channel is unreachable: the index lies beyond five total standard deviations of "
            "anything they predict.",
            "Fit the channels that reach any index, spin-noise and companion; below 3, look for a torque that is no "
            "dipole's or a field that grows.",
        ),
        Flag(
            "failed",
            "At least one posterior run failed; it is left out of probabilities and averages.",
            "Read the reason in channels.ecsv and log.txt; the same command tries the failed runs again.",
        ),
        Flag(
            "unreachable",
            "The channel cannot give this index; its probability is zero.",
            "Nothing to do, unless every channel is unreachable.",
            warns=False,
        ),
        Flag(
            "poor-mixing",
            "The chains of a posterior run disagree or move slowly (R-hat above 1.01, bulk effective sample "
            "size below 400, or more than 0.5 % of the draws divergent), also after one longer run.",
            "Fit the object again with more --tune and --draws, and do not quote its intervals before.",
        ),
        Flag(
            "evidence-noisy",
            "The standard error of a ln evidence is above 0.05, so channel probabilities are uncertain.",
            "Fit the object again with more --draws; judge close odds by best_probability_err.",
        ),
        Flag(
            "topped-up",
            "The chains mixed poorly but the importance weights were good; draws come from the weights.",
            "Nothing to do; effective sample sizes count the weights.",
            warns=False,
        ),
        Flag(
            "weighted",
            "The draws come from importance weights, as for every channel without field decay that needs no chains.",
            "Nothing to do; effective sample sizes count the weights, and there is no R-hat.",
            warns=False,
        ),
        Flag(
            "retried",
            "A first posterior run was too poor, so a longer one took its place.",
            "Nothing to do, unless the longer one carries another flag.",
            warns=False,
        ),
        Flag(
            "old",
            "The characteristic age is beyond the 10 Myr that the cooling fits cover.",
            "Take the decay by phonons with care: the age prior ends where the cooling fits end.",
        ),
        Flag(
            "period-range",
            "The period lies outside 1 ms to 100 s.",
            "Check the unit of the period.",
        ),
        Flag(
            "large-index-error",
            "The error of the braking index exceeds both its size and 10.",
            "Expect the posterior to repeat the prior.",
        ),
        Flag(
            "index-mismatch",
            "The given braking index and the one from the second derivative differ by more than three sigma.",
            "Correct the table; the given index was used.",
        ),
        Flag(
            "value-ignored",
            "A quantity of this row was not used.",
            "See what decayinfer check says about the row.",
        ),
        Flag(
            "measurements-disagree",
            "A further measurement (age, surface temperature, thermal luminosity or obliquity) lies where the "
            "posterior without it leaves less than 0.003.",
            "Do not quote the joint posterior: check the measurement, its error, and whether the channel or the "
            "cooling scenario holds for this object.",
        ),
        Flag(
            "limit-only",
            "The braking index is an upper limit.",
            "The posterior tells what the limit rules out; it cannot name a channel.",
        ),
        Flag(
            "prior-dominated",
            "The posterior of the mass is as wide as its prior and in the same place.",
            "Do not quote the mass as measured; it repeats the prior.",
        ),
    )
}


def describe(name: str) -> str:
    """Return the meaning and the remedy of a flag.

    Raises
    ------
    UnknownNameError
        If there is no such flag.

    Examples
    --------
    >>> describe("old")
    'The characteristic age is beyond the 10 Myr that the cooling fits cover. Take the decay ...'
    """
    if name not in FLAGS:
        raise UnknownNameError("flag", name, FLAGS)
    return f"{FLAGS[name].meaning} {FLAGS[name].remedy}"


def warns(name: str) -> bool:
    """Tell whether a posterior run's flag is one for its object too; unknown flags are."""
    return name not in FLAGS or FLAGS[name].warns


def join_flags(names: Iterable[str]) -> str:
    """Return flags as tables hold them: each once, in the order of the registry, separated by commas."""
    order = {name: rank for rank, name in enumerate(FLAGS)}
    return ",".join(sorted(set(names), key=lambda name: (order.get(name, len(order)), name)))


def split_flags(text: str) -> tuple[str, ...]:
    """Return the flags of a table cell."""
    return tuple(text.split(",")) if text else ()
