"""The channels by name, and what each declares."""

import pytest

from decayinfer.channels.base import Channel
from decayinfer.channels.registry import channel_names, load_channel
from decayinfer.errors import UnknownNameError
from decayinfer.inference.outcome import PARAMETERS

NAMES = (
    "constant",
    "impurity",
    "phonon",
    "hall",
    "impurity+phonon",
    "impurity+hall",
    "phonon+hall",
    "impurity+phonon+hall",
)


RIVALS = ("obliquity-vacuum", "obliquity-plasma", "companion", "spin-noise", "glitch")


def test_names_in_the_order_of_the_tables():
    assert channel_names(rivals=False) == NAMES
    assert channel_names(rivals=True) == RIVALS
    assert channel_names() == NAMES + RIVALS


@pytest.mark.parametrize("name", RIVALS)
def test_a_rival_has_no_decay_and_reports_parameters_of_its_own(name):
    rival = load_channel(name)
    assert rival.name == name
    assert rival.title
    assert not rival.decays
    assert len(set(rival.parameters)) == len(rival.parameters)
    assert set(rival.parameters) <= {parameter.name for parameter in PARAMETERS}
    assert set(rival.own) < set(rival.parameters)
    assert set(load_channel("constant").parameters) < set(rival.parameters)


@pytest.mark.parametrize("name", NAMES)
def test_a_channel_is_the_sum_that_its_name_says(name):
    channel = load_channel(name)
    assert channel.name == name
    assert channel.title
    parts = [] if name == "constant" else name.split("+")
    assert channel.decays == bool(parts)
    assert channel.flags == tuple(float(part in parts) for part in ("phonon", "impurity", "hall"))


@pytest.mark.parametrize("name", NAMES)
def test_reported_parameters_are_known_and_its_own(name):
    reported = load_channel(name).parameters
    assert len(set(reported)) == len(reported)
    assert set(reported) <= {parameter.name for parameter in PARAMETERS}
    own = {"impurity": "impurity_parameter", "phonon": "phonon_time", "hall": "hall_time"}
    for process, parameter in own.items():
        assert (parameter in reported) == (process in name.split("+"))
        assert (f"share_{process}" in reported) == (process in name.split("+"))


def test_an_unknown_channel_lists_the_known_ones():
    with pytest.raises(UnknownNameError, match=r"no channel 'gravity'.*impurity\+phonon\+hall"):
        load_channel("gravity")


def test_channels_are_values():
    assert Channel(name="a", title="b", hall=True) == Channel(name="a", title="b", hall=True)
    with pytest.raises(AttributeError):
        load_channel("hall").name = "drift"
