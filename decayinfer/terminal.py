"""What the command line shows: tables, problems, progress."""

import sys
from collections.abc import Callable, Iterable, Iterator, Sequence
from contextlib import contextmanager
from typing import TYPE_CHECKING

from rich.console import Console

if TYPE_CHECKING:
    from decayinfer.catalog import Problem
    from decayinfer.results.run import Progress

__all__ = ["print_problems", "print_table", "show_progress", "stderr", "stdout"]

#: Width of tables that are printed to a file or a pipe.
_WIDTH = 160


def stdout() -> Console:
    """Return a console on standard output, of a fixed width unless that is a terminal."""
    return Console(width=None if sys.stdout.isatty() else _WIDTH)


def stderr() -> Console:
    """Return a console on standard error."""
    return Console(stderr=True)


def print_table(heads: Sequence[str], rows: Iterable[Sequence[str]]) -> None:
    """Print a table on standard output."""
    from rich import box
    from rich.table import Table
    from rich.text import Text

    table = Table(box=box.SIMPLE_HEAD, pad_edge=False)
    for head in heads:
        table.add_column(Text(head))
    for row in rows:
        table.add_row(*(Text(cell) for cell in row))
    stdout().print(table)


def print_problems(console: Console, problems: "Iterable[Problem]") -> None:
    """Print what is wrong with an input table, a line each."""
    for problem in problems:
        style = "red" if problem.severity == "error" else "yellow"
        console.print(
            f"{problem.severity}: {problem}", style=style, markup=False, highlight=False, soft_wrap=True
        )


@contextmanager
def show_progress() -> Iterator[Callable[["Progress"], None]]:
    """Give the function that shows progress: a bar on a terminal, a line per tenth elsewhere."""
    console = stderr()
    if not console.is_terminal:
        yield _tenths(console)
        return
    from rich import progress as rich

    columns = (
        rich.TextColumn("{task.completed:.0f}/{task.total:.0f} posterior runs"),
        rich.BarColumn(bar_width=24),
        rich.TimeRemainingColumn(),
        rich.TextColumn("left; at work: {task.description}", markup=False),
    )
    with rich.Progress(*columns, console=console, transient=True) as bar:
        task: rich.TaskID | None = None

        def show(state: "Progress") -> None:
            nonlocal task
            what = "; ".join(state.running)
            if task is None:
                task = bar.add_task(what, total=state.total, completed=state.done)
            bar.update(task, completed=state.done, description=what)

        yield show


def _tenths(console: Console) -> Callable[["Progress"], None]:
    shown = -1

    def show(state: "Progress") -> None:
        nonlocal shown
        tenth = 10 * state.done // max(state.total, 1)
        if tenth > shown:
            shown = tenth
            console.print(f"{state.done} of {state.total} posterior runs", highlight=False)

    return show
