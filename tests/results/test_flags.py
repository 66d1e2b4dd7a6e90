"""One registry of flags."""

import pytest

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
