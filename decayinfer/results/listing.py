"""The results of a run as a short table of text, for the end of a run."""

from typing import TYPE_CHECKING, Any

import numpy as np

from decayinfer.results.flags import FLAGS, split_flags
from decayinfer.results.read import Run

if TYPE_CHECKING:
    from decayinfer.catalog import Catalog

__all__ = ["CHECK_HEADER", "HEADER", "check_listing", "flag_legend", "index_text", "listing", "time_text"]

#: Column heads of `listing`.
HEADER = (
    "object", "n", "tau_c", "most probable channel", "any decay", "mass 90 % [Msun]", "prior", "phonon time 90 %",
    "flags",
)  # fmt: skip

#: Column heads of `check_listing`.
CHECK_HEADER = ("object", "n", "tau_c", "B [G]", "decay time 4 tau_c/(n - 3)", "flags")

_TIME_UNITS = ((1e6, "Myr"), (1e3, "kyr"), (1.0, "yr"))


def listing(run: Run) -> list[tuple[str, ...]]:
    """Return a row of text per object, under `HEADER`."""
    return [_row(row) for row in run.objects.to_dict("records")]


def check_listing(catalog: "Catalog") -> list[tuple[str, ...]]:
    """Return a row of text per object of a catalogue, under `CHECK_HEADER`."""
    from decayinfer.catalog import summary_table

    return [
        (
            str(row["name"]),
            index_text(
                *(float(row[f"braking_index{end}"]) for end in ("", "_err_minus", "_err_plus", "_limit"))
            ),
            time_text(float(row["characteristic_age"])),
            f"{row['field']:.2e}",
            time_text(float(row["decay_time"])),
            " ".join(split_flags(str(row["flags"]))),
        )
        for row in summary_table(catalog)
    ]


def flag_legend(run: Run) -> dict[str, str]:
    """Return the meaning of every flag that objects of a run carry, in the order of the registry."""
    used = {flag for text in run.objects["flags"] for flag in split_flags(text)}
    return {name: flag.meaning for name, flag in FLAGS.items() if name in used}


def time_text(*years: float) -> str:
    """Return times in the unit that suits the last, as a range when there are two.

    Examples
    --------
    >>> time_text(34512.0), time_text(2.1e4, 1.4e6), time_text(float("nan"))
    ('34.5 kyr', '0.021-1.4 Myr', '-')
    """
    if not np.all(np.isfinite(years)):
        return "-"
    size, unit = next(((s, u) for s, u in _TIME_UNITS if years[-1] >= s), _TIME_UNITS[-1])
    return f"{'-'.join(f'{_digits(value / size)}' for value in years)} {unit}"


def index_text(n: float, minus: float, plus: float, limit: float) -> str:
    """Return a braking index with its error, or its upper limit, to the digits of the error.

    Examples
    --------
    >>> nan = float("nan")
    >>> index_text(43.21, 1.1, 1.1, nan), index_text(20.0, 1.0, 2.5, nan), index_text(nan, nan, nan, 30.0)
    ('43.2 ± 1.1', '20.0 +2.5 -1.0', '< 30')
    """
    if not np.isfinite(n):
        return f"< {_digits(limit)}"
    decimals = max(0, 1 - int(np.floor(np.log10(min(minus, plus)))))
    if minus == plus:
        return f"{n:.{decimals}f} ± {plus:.{decimals}f}"
    return f"{n:.{decimals}f} +{plus:.{decimals}f} -{minus:.{decimals}f}"


def _row(row: dict[Any, Any]) -> tuple[str, ...]:
    best = f"{row['best_channel']} {row['best_probability']:.2f}" if row["best_channel"] else "none"
    return (
        row["object"],
        index_text(row["braking_index"], row["err_minus"], row["err_plus"], row["limit"]),
        time_text(row["characteristic_age"]),
        best,
        f"{row['probability_any_decay']:.2f}" if np.isfinite(row["probability_any_decay"]) else "-",
        _range(row["mass_q05"], row["mass_q95"]),
        _range(row["mass_prior_q05"], row["mass_prior_q95"]),
        time_text(row["phonon_time_q05"], row["phonon_time_q95"]),
        " ".join(split_flags(row["flags"])),
    )


def _range(low: float, high: float) -> str:
    return f"{low:.2f}-{high:.2f}" if np.isfinite(low) else "-"


def _digits(value: float) -> str:
    """Return three significant digits without an exponent where that stays short."""
    text = f"{value:.3g}"
    return f"{value:.0f}" if "e+" in text and value < 1e7 else text
