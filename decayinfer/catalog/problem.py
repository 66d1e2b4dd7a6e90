"""What is wrong with a table, cell by cell, and the remarks a kept object carries."""

from dataclasses import dataclass
from typing import Literal

__all__ = ["FLAGS", "Problem", "printable", "shorten"]

#: Every flag the reader can put on a pulsar, and what it says.
FLAGS = {
    "old": "characteristic age beyond 10 Myr, where the cooling curves end",
    "period-range": "period outside 1 ms to 100 s",
    "large-index-error": "error of the braking index exceeds both its size and 10",
    "index-mismatch": "given index and the one from the second derivative differ by more than 3 sigma",
    "value-ignored": "a quantity of this row was not used",
}

_LONGEST = 60  # characters of a cell that a message repeats


def printable(text: str) -> str:
    """Return text on one line, with control characters escaped."""
    return text if text.isprintable() else ascii(text)


def shorten(text: str) -> str:
    """Return printable text without the middle of a long cell."""
    safe = printable(text)
    return safe if len(safe) <= _LONGEST else f"{safe[: _LONGEST // 2]}...{safe[-_LONGEST // 4 :]}"


@dataclass(frozen=True)
class Problem:
    """One broken rule.

    Attributes
    ----------
    source : str
        File, or kind of object, that the table came from.
    row : int or None
        Data row counted from 1; None when the whole table is meant.
    name : str
        Object in that row; empty when it has none.
    column : str
        Column as the table itself calls it; empty when no single column is meant.
    rule : str
        What must hold.
    got : str
        What was found.
    remedy : str
        What to do about it.
    severity : {"error", "warning"}
        An error sets the row aside; a warning keeps it.
    """

    source: str
    row: int | None
    name: str
    column: str
    rule: str
    got: str
    remedy: str
    severity: Literal["error", "warning"]

    def __str__(self) -> str:
        """Return one sentence: where, the rule, what was found, the remedy."""
        where = [printable(self.source)]
        if self.row is not None:
            where.append(f"row {self.row}" + (f" ({shorten(self.name)})" if self.name else ""))
        if self.column:
            where.append(f"column {printable(self.column)}")
        return f"{', '.join(where)}: {self.rule}, got {self.got}; remedy: {self.remedy}"
