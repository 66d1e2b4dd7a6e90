"""The channels by name; a new module adds its channels with one line here."""

from decayinfer.channels import decay
from decayinfer.channels.base import Channel
from decayinfer.errors import UnknownNameError

__all__ = ["channel_names", "load_channel"]

_CHANNELS: dict[str, Channel] = {channel.name: channel for module in (decay,) for channel in module.CHANNELS}


def channel_names() -> tuple[str, ...]:
    """Return the names of every channel, in the order of the tables."""
    return tuple(_CHANNELS)


def load_channel(name: str) -> Channel:
    """Return the channel of that name.

    Raises
    ------
    UnknownNameError
        If no channel has that name.
    """
    if name not in _CHANNELS:
        raise UnknownNameError("channel", name, channel_names())
    return _CHANNELS[name]
