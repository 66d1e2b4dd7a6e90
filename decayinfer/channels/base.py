"""What a channel is: one explanation of the secular braking index."""

from dataclasses import dataclass

__all__ = ["Channel"]

_ALWAYS = ("mass", "age", "birth_field", "birth_period", "field", "braking_index", "crust_temperature")


@dataclass(frozen=True, kw_only=True)
class Channel:
    """An explanation of n by the processes that make the field decay.

    Attributes
    ----------
    name, title : str
        Registry name and a short description.
    phonon, impurity, hall : bool
        Whether electron-phonon scattering, electron-impurity scattering and Hall drift act.
    secular : bool
        Whether the index is one of the spin-down itself, which lasts, rather than of something laid over it.
    """

    name: str
    title: str
    phonon: bool = False
    impurity: bool = False
    hall: bool = False
    secular: bool = True

    @property
    def decays(self) -> bool:
        """Whether the field decays at all."""
        return self.phonon or self.impurity or self.hall

    @property
    def flags(self) -> tuple[float, float, float]:
        """Switches of phonon scattering, impurity scattering and Hall drift for the history kernel."""
        return float(self.phonon), float(self.impurity), float(self.hall)

    @property
    def parameters(self) -> tuple[str, ...]:
        """Names of the parameters that a posterior under this channel reports."""
        acting = [name for name in ("impurity", "phonon", "hall") if getattr(self, name)]
        named = {"impurity": "impurity_parameter", "phonon": "phonon_time", "hall": "hall_time"}
        own = [named[name] for name in acting]
        return (*_ALWAYS, *own, *(f"share_{name}" for name in acting), *(["decay_time"] if acting else []))
