"""Constant field, and decay by impurity scattering, phonon scattering, Hall drift and their sums."""

from itertools import combinations

from decayinfer.channels.base import Channel

__all__ = ["CHANNELS", "CONSTANT"]

_PROCESSES = {
    "impurity": "electron-impurity scattering",
    "phonon": "electron-phonon scattering",
    "hall": "Hall drift",
}

CONSTANT = Channel(name="constant", title="constant dipole, n = 3")


def _sums() -> tuple[Channel, ...]:
    made = []
    for size in range(1, len(_PROCESSES) + 1):
        for acting in combinations(_PROCESSES, size):
            title = " and ".join(_PROCESSES[name] for name in acting)
            made.append(Channel(name="+".join(acting), title=title, **dict.fromkeys(acting, True)))
    return tuple(made)


CHANNELS = (CONSTANT, *_sums())
