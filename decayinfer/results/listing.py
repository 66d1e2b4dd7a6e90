"""The results of a run as a short table of text, for the end of a run."""

from typing import Any

import numpy as np

from decayinfer.results.flags import FLAGS, split_flags
from decayinfer.results.read import Run

__all__ = ["HEADER", "flag_legend", "listing", "time_text"]

#: Column heads of `listing`.
HEADER = (
    "object", "n", "tau_c", "most probable channel", "mass 90 % [Msun]", "prior", "phonon time 90 %", "flags",
)  # fmt: skip

_TIME_UNITS = ((1e6, "Myr"), (1e3, "kyr"), (1.0, "yr"))


def listing(run: Run) -> list[tuple[str, ...]]:
    """Return a row of text per object, under `HEADER`."""
    return [_row(row) for row in run.objects.to_dict("records")]


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


def _row(row: dict[Any, Any]) -> tuple[str, ...]:
    best = f"{row['best_channel']} {row['best_probability']:.2f}" if row["best_channel"] else "none"
    return (
        row["object"],
        _index(row),
        time_text(row["characteristic_age"]),
        best,
        _range(row["mass_q05"], row["mass_q95"]),
        _range(row["mass_prior_q05"], row["mass_prior_q95"]),
        time_text(row["phonon_time_q05"], row["phonon_time_q95"]),
        " ".join(split_flags(row["flags"])),
    )


def _index(row: dict[Any, Any]) -> str:
    n, minus, plus = row["braking_index"], row["err_minus"], row["err_plus"]
    if not np.isfinite(n):
        return f"< {_digits(row['limit'])}"
    decimals = max(0, 1 - int(np.floor(np.log10(min(minus, plus)))))
    if minus == plus:
        return f"{n:.{decimals}f} ± {plus:.{decimals}f}"
    return f"{n:.{decimals}f} +{plus:.{decimals}f} -{minus:.{decimals}f}"


def _range(low: float, high: float) -> str:
    return f"{low:.2f}-{high:.2f}" if np.isfinite(low) else "-"


def _digits(value: float) -> str:
    """Return three significant digits without an exponent where that stays short."""
    text = f"{value:.3g}"
    return f"{value:.0f}" if "e+" in text and value < 1e7 else text
