"""What decayinfer raises.

::

    DecayinferError
    ├── InputError (ValueError)      a table, column, unit or value that cannot be used
    ├── UnknownNameError (KeyError)  a channel, cooling scenario or object that does not exist
    ├── SamplingError (RuntimeError) a posterior run that could not be made
    └── RunFolderError (OSError)     a run folder that cannot be read, written or resumed

Every message names what was found, the rule it breaks and the remedy.
"""

from collections.abc import Iterable

__all__ = ["DecayinferError", "InputError", "RunFolderError", "SamplingError", "UnknownNameError"]


class DecayinferError(Exception):
    """Base of every error that decayinfer raises on purpose."""


class InputError(DecayinferError, ValueError):
    """A table, column, unit or value that cannot be used."""


class UnknownNameError(DecayinferError, KeyError):
    """A name that is in no registry.

    Parameters
    ----------
    kind : str
        What the name should have been, such as ``"channel"``.
    name : str
        The name that was given.
    known : iterable of str
        The names that exist.
    """

    def __init__(self, kind: str, name: str, known: Iterable[str]) -> None:
        self.kind, self.name, self.known = kind, name, tuple(known)
        super().__init__(f"there is no {kind} {name!r}; choose from: {', '.join(self.known)}")

    def __str__(self) -> str:
        """Return the sentence itself, without the quotes KeyError puts around it."""
        return str(self.args[0])


class SamplingError(DecayinferError, RuntimeError):
    """A posterior run that could not be made."""


class RunFolderError(DecayinferError, OSError):
    """A run folder that cannot be read, written or resumed."""
