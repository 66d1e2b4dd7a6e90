"""Progress and tables as a terminal and a pipe see them."""

import io

import pytest
from rich.console import Console

from decayinfer import terminal
from decayinfer.results.run import Progress

STATES = [
    Progress(0, 4, ("A cool hall",)),
    Progress(2, 4, ("B cool hall", "C cool [hall]")),
    Progress(4, 4),
]


@pytest.fixture
def shown(monkeypatch):
    """Show some progress on a console and return the text."""

    def show(**console):
        text = io.StringIO()
        monkeypatch.setattr(terminal, "stderr", lambda: Console(file=text, width=110, **console))
        with terminal.show_progress() as progress:
            for state in STATES:
                progress(state)
        return text.getvalue()

    return show


def test_a_terminal_gets_a_bar_with_counts_time_left_and_what_is_at_work(shown):
    text = shown(force_terminal=True)
    assert "4/4 posterior runs" in text
    assert "left; at work:" in text
    assert "━" in text


def test_a_pipe_gets_a_few_plain_lines(shown):
    assert shown().splitlines() == [f"{k} of 4 posterior runs" for k in (0, 2, 4)]


def test_many_steps_give_a_line_per_tenth(monkeypatch):
    text = io.StringIO()
    monkeypatch.setattr(terminal, "stderr", lambda: Console(file=text, width=110))
    with terminal.show_progress() as progress:
        for k in range(1001):
            progress(Progress(k, 1000))
    assert len(text.getvalue().splitlines()) == 11


def test_names_are_printed_as_they_are(capsys):
    terminal.print_table(("object [x]",), [("J[red]1+2[/red]",)])
    printed = capsys.readouterr().out
    assert "object [x]" in printed
    assert "J[red]1+2[/red]" in printed
