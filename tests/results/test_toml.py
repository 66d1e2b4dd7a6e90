"""What is written as TOML reads back the same."""

import tomllib

from hypothesis import given
from hypothesis import strategies as st

from decayinfer.results.toml import to_toml

text = st.text(st.characters(exclude_categories=["Cs"]))
scalars = text | st.booleans() | st.integers(-(2**60), 2**60) | st.floats(allow_nan=False)
values = st.recursive(
    st.dictionaries(text, scalars | st.lists(scalars)),
    lambda inner: st.dictionaries(text, scalars | inner),
    max_leaves=8,
)


@given(values)
def test_round_trip(content):
    assert tomllib.loads(to_toml(content, comment="two\nlines")) == content


def test_nan_and_none():
    back = tomllib.loads(to_toml({"a": float("nan"), "b": None, "c": {"d": float("-inf")}}))
    assert back["a"] != back["a"]
    assert "b" not in back
    assert back["c"]["d"] == float("-inf")


def test_lone_surrogates_do_not_stop_a_run():
    assert tomllib.loads(to_toml({"a": "x\udcff"})) == {"a": "x?"}
