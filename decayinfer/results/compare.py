"""Bayes factors of any pair of channels, object by object, per cooling scenario and averaged.

Where one channel is another with a parameter held at a value, the Savage-Dickey density ratio (Dickey 1971, Ann. Math.
Stat. 42, 204) is a second opinion that needs no evidence: the posterior density over the prior density at that value.
Here it applies to the constant dipole within spin noise, whose Gaussian number is zero. (Decay at zero rate lies at
minus infinity of its lognormal priors, where no density is left.)
"""

from collections.abc import Iterator, Mapping, Sequence
from typing import TYPE_CHECKING, Any

import numpy as np

from decayinfer.cooling.registry import load_scenario
from decayinfer.errors import UnknownNameError
from decayinfer.inference.outcome import ChannelFit, Status
from decayinfer.results.sensitivity import average_evidence

if TYPE_CHECKING:
    from pandas import DataFrame

    from decayinfer.results.read import Run

__all__ = ["HEADER", "compare", "listing", "savage_dickey"]

#: Heads of the table that `listing` fills.
HEADER = ("object", "scenario", "ln Bayes factor", "Bayes factor", "second opinion")

_NESTED = {("constant", "spin-noise"): "noise"}  # the standard normal coordinate that is zero in the first
_LN_NORMAL = -0.5 * float(np.log(2.0 * np.pi))  # its prior density there
_NEAR = 30  # posterior draws on each side of zero without which its density there is not known


def compare(run: "Run", first: str, second: str, *, objects: Sequence[str] = ()) -> "DataFrame":
    """Return the Bayes factor of two channels for every object of a run.

    Parameters
    ----------
    run : Run
        A finished run.
    first, second : str
        Channels; the factor is evidence of the first over evidence of the second.
    objects : sequence of str
        Names; empty means all.

    Returns
    -------
    pandas.DataFrame
        A row per object and scenario, and one ``averaged`` over scenarios by their weights: ln_bayes_factor and its
        standard error, infinite where one channel cannot give the index, nan where one failed; savage_dickey and its
        error, nan where it does not apply.

    Raises
    ------
    UnknownNameError
        If the run has no such channel or object.
    """
    from pandas import DataFrame

    settings, names = run.record["settings"], run.record["input"]["objects"]
    asked = [("channel", c, settings["channels"]) for c in (first, second)]
    for kind, given, known in asked + [("object", name, names) for name in objects]:
        if given not in known:
            raise UnknownNameError(kind, given, known)
    weights = {name: _weight(name) for name in settings["cooling"]}
    rows = [row for name in objects or names for row in _rows(run, name, (first, second), weights)]
    return DataFrame(rows)


def listing(frame: "DataFrame") -> list[tuple[str, ...]]:
    """Return a row of text for each row of `compare`, under `HEADER`."""
    return [_line({str(key): value for key, value in row.items()}) for row in frame.to_dict("records")]


def savage_dickey(wider: ChannelFit, coordinate: str) -> tuple[float, float]:
    """Return ln of posterior over prior density at zero of a standard normal coordinate, and its standard error.

    Parameters
    ----------
    wider : ChannelFit
        The channel in which the coordinate is free.
    coordinate : str
        Zero in the narrower channel, where the other coordinates keep their priors.

    Returns
    -------
    tuple of float
        nan when too few draws lie on either side of zero to know the density there.
    """
    if wider.draws is None or "posterior" not in wider.draws:
        return np.nan, np.nan
    draws = np.asarray(wider.draws["posterior"].dataset["coordinates"].sel(coordinate=coordinate)).ravel()
    value, err = _ln_density_at_zero(draws)
    # draws resampled from weights repeat
    return value - _LN_NORMAL, err * float(np.sqrt(max(1.0, draws.size / wider.ess_bulk_min)))


def _ln_density_at_zero(draws: Any) -> tuple[float, float]:
    """Share of draws in a window about zero over its width; the window holds a tenth of the nearer side."""
    below, above = np.sort(-draws[draws < 0.0]), np.sort(draws[draws > 0.0])
    fewer = min(below.size, above.size)
    if fewer < _NEAR:
        return np.nan, np.nan
    half = min(side[max(_NEAR, fewer // 10) - 1] for side in (below, above))
    inside = int(np.sum(np.abs(draws) <= half))
    return float(np.log(inside / draws.size / (2.0 * half))), inside**-0.5


def _rows(
    run: "Run", name: str, pair: tuple[str, str], weights: Mapping[str, float]
) -> Iterator[dict[str, Any]]:
    fits = {(s, c): run.fit(name, s, c) for s in weights for c in pair}
    opinions = []
    for scenario in weights:
        runs = [[fits[scenario, c]] for c in pair]
        opinions.append(_second_opinion(*(r[0] for r in runs)))
        yield _row(name, scenario, runs, weights, opinions[-1])
    runs = [[fits[s, c] for s in weights] for c in pair]
    yield _row(name, "averaged", runs, weights, (np.nan, np.nan))


def _row(
    name: str,
    scenario: str,
    runs: list[list[ChannelFit]],
    weights: Mapping[str, float],
    opinion: tuple[float, float],
) -> dict[str, Any]:
    (a, a_err), (b, b_err) = (average_evidence(each, weights) for each in runs)
    with np.errstate(invalid="ignore"):  # neither channel can give the index
        factor = np.subtract(a, b)
    return {
        "object": name,
        "scenario": scenario,
        "ln_bayes_factor": float(factor),
        "ln_bayes_factor_err": float(np.hypot(a_err, b_err)),
        "savage_dickey": opinion[0],
        "savage_dickey_err": opinion[1],
    }


def _second_opinion(first: ChannelFit, second: ChannelFit) -> tuple[float, float]:
    for (narrow, wide), coordinate in _NESTED.items():
        for sign, (a, b) in ((1.0, (first, second)), (-1.0, (second, first))):
            if (a.channel, b.channel) == (narrow, wide) and b.status is Status.OK:
                value, err = savage_dickey(b, coordinate)
                return sign * value, err
    return np.nan, np.nan


def _weight(scenario: str) -> float:
    try:
        return load_scenario(scenario).weight
    except UnknownNameError:  # a table of the user's own, which this process has not read
        return 1.0


def _line(row: Mapping[str, Any]) -> tuple[str, ...]:
    factor, err = row["ln_bayes_factor"], row["ln_bayes_factor_err"]
    said = f"{row['savage_dickey']:.2f} +- {row['savage_dickey_err']:.2f}"
    odds = (
        f"{np.exp(factor):.3g}"
        if np.isfinite(factor)
        else {np.inf: "second out of reach", -np.inf: "0"}.get(factor, "-")
    )
    return (
        row["object"],
        row["scenario"],
        f"{factor:.2f} +- {err:.2f}" if np.isfinite(factor) else str(factor),
        odds,
        said if np.isfinite(row["savage_dickey"]) else "-",
    )
