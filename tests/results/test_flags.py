"""One registry of flags."""

import re
from pathlib import Path

import pytest

import decayinfer
from decayinfer import catalog
from decayinfer.errors import UnknownNameError
from decayinfer.results.flags import FLAGS, describe, join_flags, split_flags, warns


def test_every_flag_says_what_it_means_and_what_to_do():
    for name, flag in FLAGS.items():
        assert name == flag.name
        assert flag.meaning.endswith(".")
        assert flag.remedy.endswith(".")
        assert "," not in name


def test_the_reader_s_flags_are_registered():
    assert set(catalog.FLAGS) <= set(FLAGS)


def test_describe():
    assert describe("failed").startswith("At least one posterior run failed")
    with pytest.raises(UnknownNameError, match="no flag 'odd'"):
        describe("odd")


def test_flags_join_in_the_order_of_the_registry_and_split_again():
    text = join_flags({"old", "failed", "zebra", "no-channel"})
    assert text == "no-channel,failed,old,zebra"
    assert split_flags(text) == ("no-channel", "failed", "old", "zebra")
    assert split_flags(join_flags([])) == ()


def test_remarks_of_a_run_are_no_flags_of_its_object():
    assert warns("poor-mixing")
    assert not warns("retried")


def test_the_fit_s_flags_are_registered():
    folder = Path(decayinfer.__file__).parent / "inference"
    text = "".join(path.read_text() for path in folder.glob("*.py"))
    given = set(re.findall(r'flags\.append\("([a-z-]+)"\)|flags=\("([a-z-]+)",\)', text))
    names = {name for pair in given for name in pair if name}
    assert {"poor-mixing", "evidence-noisy"} <= names
    assert names <= set(FLAGS)
