"""What comes out of a table: the objects that can be fitted, and every problem."""

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

from decayinfer.catalog.problem import Problem
from decayinfer.catalog.pulsar import Pulsar
from decayinfer.errors import UnknownNameError

if TYPE_CHECKING:
    from astropy.table import Table

__all__ = ["Catalog"]


@dataclass(frozen=True, eq=False)
class Catalog:
    """The objects of a table.

    Attributes
    ----------
    source : str
        File, or kind of object, that the table came from.
    pulsars : tuple of Pulsar
        Objects whose row breaks no rule, in the order of the table.
    problems : tuple of Problem
        Every broken rule: those of the table as a whole first, then row by row.
    table : astropy.table.Table
        The table as read, with all its rows, columns and units.
    rows : tuple of int
        Data row of each pulsar, counted from 1.
    columns : mapping of str to str
        Known column name to the table's own.
    """

    source: str
    pulsars: tuple[Pulsar, ...]
    problems: tuple[Problem, ...]
    table: "Table"
    rows: tuple[int, ...] = ()
    columns: Mapping[str, str] = field(default_factory=dict)

    def __len__(self) -> int:
        """Return the number of pulsars."""
        return len(self.pulsars)

    def __getitem__(self, name: str) -> Pulsar:
        """Return a pulsar by name.

        Raises
        ------
        UnknownNameError
            When no pulsar has the name.
        """
        for pulsar in self.pulsars:
            if pulsar.name == name:
                return pulsar
        raise UnknownNameError("pulsar", name, [pulsar.name for pulsar in self.pulsars])

    @property
    def rows_set_aside(self) -> tuple[int, ...]:
        """Data rows with an error, counted from 1."""
        return tuple(sorted({p.row for p in self.problems if p.row is not None and p.severity == "error"}))
