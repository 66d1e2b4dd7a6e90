"""What a fit is told to do: channels, cooling scenarios, sampler length and seed."""

from dataclasses import asdict, dataclass, field
from typing import Any

from decayinfer.errors import InputError
from decayinfer.inference.priors import Priors

__all__ = ["FitSettings"]


@dataclass(frozen=True, kw_only=True)
class FitSettings:
    """The settings of a fit, checked once when made.

    Parameters
    ----------
    channels : tuple of str
        Channel names; empty means every registered channel.
    cooling : tuple of str
        Cooling scenario names; empty means the standard set, ``("all",)`` every scenario that is not provisional.
    draws, tune, chains : int
        Kept draws and warm-up draws of each chain, and the number of chains.
    seed : int
        Seed of the run. The seed of one posterior run derives from it and from the names of object,
        scenario and channel, so that neither order nor the number of workers changes a number.
    priors : Priors
        Prior distributions of the physical parameters.

    Raises
    ------
    InputError
        If a count is not positive.
    """

    channels: tuple[str, ...] = ()
    cooling: tuple[str, ...] = ()
    draws: int = 1000
    tune: int = 400
    chains: int = 2
    seed: int = 1
    priors: Priors = field(default_factory=Priors)

    def __post_init__(self) -> None:
        for name, least in (("draws", 100), ("tune", 50), ("chains", 2)):
            if getattr(self, name) < least:
                raise InputError(f"{name} must be at least {least}, got {getattr(self, name)}")
        if self.seed < 0:
            raise InputError(f"seed must be zero or positive, got {self.seed}")

    def as_dict(self) -> dict[str, Any]:
        """Return the settings as plain values, ready for run.toml."""
        return asdict(self)
