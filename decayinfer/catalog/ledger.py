"""The book in which the rules write down what they find."""

from collections.abc import Callable
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from decayinfer.catalog.cells import Cells
from decayinfer.catalog.problem import FLAGS, Problem

__all__ = ["Ledger", "Rows"]

Rows = NDArray[np.bool_]

#: What a message says was found in a row, counted from 0.
type Got = Callable[[int], str] | None


class Ledger:
    """Problems, rows set aside and flags, collected while a table is read.

    Parameters
    ----------
    source : str
        Name of the table.
    names : list of str
        Object name of each row, empty where there is none.

    Attributes
    ----------
    aside : (n_row,) array of bool
        Rows with an error.
    """

    def __init__(self, source: str, names: list[str]) -> None:
        self.source, self.names = source, names
        self.aside: Rows = np.zeros(len(names), bool)
        self._problems: list[Problem] = []
        self._flags: list[list[str]] = [[] for _ in names]

    def refuse(self, rows: Rows, cells: Cells, rule: str, remedy: str, got: Got = None) -> None:
        """Set rows aside because a cell breaks a rule; `got` says what was found if not the cell itself."""
        self.aside |= rows
        self._note(rows, cells, rule, remedy, got, "error")

    def flag(self, rows: Rows, cells: Cells, flag: str, rule: str, remedy: str, got: Got = None) -> None:
        """Keep rows, but flag them."""
        if flag not in FLAGS:
            raise ValueError(f"no flag {flag!r}")
        self._note(rows, cells, rule, remedy, got, "warning")
        for row in np.flatnonzero(rows):
            if flag not in self._flags[row]:
                self._flags[row].append(flag)

    def remark(self, column: str, rule: str, got: str, remedy: str) -> None:
        """Note a warning about the table as a whole."""
        self._problems.append(Problem(self.source, None, "", column, rule, got, remedy, "warning"))

    def flags(self, row: int) -> tuple[str, ...]:
        """Return the flags of a row."""
        return tuple(self._flags[row])

    def problems(self) -> tuple[Problem, ...]:
        """Return every problem, those of the whole table first, then row by row."""
        return tuple(sorted(self._problems, key=lambda problem: problem.row or 0))

    def _note(
        self,
        rows: Rows,
        cells: Cells,
        rule: str,
        remedy: str,
        got: Got,
        severity: Literal["error", "warning"],
    ) -> None:
        for row in np.flatnonzero(rows).tolist():
            found = (got or cells.got)(row)
            self._problems.append(
                Problem(self.source, row + 1, self.names[row], cells.column, rule, found, remedy, severity)
            )
