"""The channels by name; a new module adds its channels with one line here."""

from decayinfer.channels import companion, decay, glitch, obliquity, spin_noise
from decayinfer.channels.base import Channel
from decayinfer.channels.rival import Rival
from decayinfer.errors import UnknownNameError

__all__ = ["channel_names", "load_channel"]

_MODULES = (decay, obliquity, companion, spin_noise, glitch)
_CHANNELS: dict[str, Channel] = {c.name: c for module in _MODULES for c in module.CHANNELS}


def channel_names(*, rivals: bool | None = None) -> tuple[str, ...]:
    """Return the names of every channel in the order of the tables.

    Parameters
    ----------
    rivals : bool, optional
        True for the rivals of decay only, False for constant field and decay only.
    """
    return tuple(
        name for name, channel in _CHANNELS.items() if rivals is None or isinstance(channel, Rival) == rivals
    )


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
