"""Timing facts of an object that some explanations of n use: data span, last glitch, spin noise, kind of index."""

from collections.abc import Mapping
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from decayinfer.catalog.cells import Cells
from decayinfer.catalog.ledger import Ledger, Rows

__all__ = ["INDEX_KINDS", "Facts", "read_facts", "read_index_kind"]

Floats = NDArray[np.float64]

#: How an index was measured.
INDEX_KINDS = ("interglitch", "long-term")

_LOG10 = (
    -40.0,
    -10.0,
)  # of |nuddot| [Hz/s^2]: the catalogued ones with room to spare; outside it is no logarithm
_REMEDY = "correct the value or leave it blank"


class Facts(NamedTuple):
    """Facts of every row; arrays of shape (n_row,), nan where unknown. The names are those of the columns."""

    data_span: Floats
    glitch_nudot_step: Floats
    glitch_time_since: Floats
    spin_noise_log10_scale: Floats
    spin_noise_log10_scale_err: Floats

    def of(self, row: int) -> dict[str, float]:
        """Return the facts of a row, counted from 0, by name."""
        return {name: float(values[row]) for name, values in self._asdict().items()}


def read_facts(cells: Mapping[str, Cells], ledger: Ledger) -> Facts:
    """Check the columns of facts; one that cannot be used is set aside, its row is not.

    Parameters
    ----------
    cells : mapping of str to Cells
        Columns by known name.
    ledger : Ledger
        Receives what is wrong.
    """
    return Facts(*(_fact(name, cells[name], ledger) for name in Facts._fields))


def _fact(name: str, cells: Cells, ledger: Ledger) -> Floats:
    if cells.raw is None:
        return cells.values
    if name == "spin_noise_log10_scale":
        inside: Rows = (cells.values > _LOG10[0]) & (cells.values < _LOG10[1])
        rule = f"must be log10 of |nuddot| in Hz/s^2, between {_LOG10[0]:g} and {_LOG10[1]:g}, to be used"
    else:
        inside, rule = cells.values > 0, "must be positive and finite to be used"
    broken = cells.bad | (cells.given & ~inside)
    ledger.flag(broken, cells, "value-ignored", rule, _REMEDY)
    return np.where(broken, np.nan, cells.values)


def read_index_kind(cells: Cells, ledger: Ledger) -> list[str]:
    """Return how the index of every row was measured, one of `INDEX_KINDS`; empty where that is not said.

    Parameters
    ----------
    cells : Cells
        The column as text, in `raw`.
    ledger : Ledger
        Receives words that are not known.
    """
    known = {_folded(kind): kind for kind in INDEX_KINDS}
    kinds = [known.get(_folded(text), "") for text in cells.raw]
    unknown = np.array([bool(text) and not kind for text, kind in zip(cells.raw, kinds, strict=True)], bool)
    rule = f"must be {' or '.join(INDEX_KINDS)} to be used"
    ledger.flag(unknown, cells, "value-ignored", rule, "correct the word or leave it blank")
    return kinds


def _folded(text: str) -> str:
    return "".join(letter for letter in text.casefold() if letter not in "-_ ")
