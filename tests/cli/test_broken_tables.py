"""Broken tables: an error, or rows set aside, never a crash."""

from hypothesis import given, settings
from hypothesis import strategies as st
from typer.testing import CliRunner

from decayinfer.cli import app

HEADS = (
    "name",
    "period",
    "period_derivative",
    "braking_index",
    "braking_index_err",
    "braking_index_limit",
    "age",
)

numbers = st.sampled_from(["0.2", "5e-14", "20", "-1", "0", "nan", "inf", "1e400", "", "--", "1,5", "2e-320"])
cells = numbers | st.text(max_size=8)
lines = st.lists(st.lists(cells, max_size=8).map(",".join), max_size=6)
heads = st.just(HEADS) | st.lists(st.sampled_from(HEADS) | st.text(max_size=5), max_size=8)


def checked(tmp_path_factory, content, name="t.csv"):
    path = tmp_path_factory.mktemp("broken") / name
    path.write_bytes(content)
    return CliRunner().invoke(app, ["check", str(path)])


@settings(max_examples=150, deadline=None)
@given(head=heads, rows=lines)
def test_broken_text(tmp_path_factory, head, rows):
    content = "\n".join([",".join(head), *rows]).encode("utf-8", "replace")
    result = checked(tmp_path_factory, content)
    assert result.exit_code in (0, 1, 2), result.exception
    assert result.exception is None or isinstance(result.exception, SystemExit)
    assert "Traceback" not in result.output


@settings(max_examples=100, deadline=None)
@given(content=st.binary(max_size=200), ending=st.sampled_from([".csv", ".ecsv", ".fits", ".xml", ".txt"]))
def test_broken_bytes(tmp_path_factory, content, ending):
    result = checked(tmp_path_factory, content, f"t{ending}")
    assert result.exit_code in (1, 2), result.exception
    assert isinstance(result.exception, SystemExit)


def test_a_table_of_ten_thousand_rows(tmp_path_factory):
    rows = [f"J{k},{0.1 + k * 1e-5},5e-14,20,1," for k in range(10_000)]
    result = checked(tmp_path_factory, "\n".join([",".join(HEADS), *rows]).encode())
    assert result.exit_code == 0, result.output[-500:]
    assert "10000 objects can be fitted" in result.stdout
