"""A cooling scenario: its name card, its star and the coefficients of its temperature history."""

import tomllib
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from decayinfer.cooling import form
from decayinfer.errors import InputError
from decayinfer.physics import structure
from decayinfer.physics.namespace import namespace

__all__ = ["Scenario", "read_scenario", "write_scenario"]


@dataclass(frozen=True, kw_only=True, eq=False)
class Scenario:
    """Crust temperature and structure of a star as functions of age and mass.

    Attributes
    ----------
    name, title, description : str
        Registry name, a short title, and the physics in a few sentences.
    sources : tuple of str
        The papers the scenario rests on.
    provisional : bool
        True for a scenario built on scalings instead of a computed cooling curve.
    standard : bool
        True for a scenario that is fitted when none is named.
    weight : float
        Prior weight among scenarios, relative to the others.
    properties : mapping of str to str
        What the scenario is made of: eos, superfluidity, envelope, direct_urca.
    fit_error : mapping of str to float
        Largest error of the analytic fit, as fractions: ``temperature`` and ``slope``.
    table : (2, 16, 4) array
        Chebyshev coefficients, see `decayinfer.cooling.form`.
    scalars : (10,) array
        Scalars, see `decayinfer.cooling.form`.
    ln_radius, ln_inertia : (4,) array
        Chebyshev coefficients in mass of ln R [km] and of ln I [1e45 g cm^2].
    """

    name: str
    title: str
    description: str
    sources: tuple[str, ...]
    provisional: bool
    standard: bool = False
    weight: float = 1.0
    properties: Mapping[str, str] = field(default_factory=dict)
    fit_error: Mapping[str, float] = field(default_factory=dict)
    table: NDArray[np.float64]
    scalars: NDArray[np.float64]
    ln_radius: NDArray[np.float64]
    ln_inertia: NDArray[np.float64]

    def ln_temperature(self, ln_age: Any, mass: Any) -> Any:
        """Return ln(T_b / 1e8 K) at ln(age / yr) and mass [M_sun]; NumPy or PyTensor."""
        return form.ln_temperature(ln_age, mass, self.table, self.scalars)

    def ln_radius_km(self, mass: Any) -> Any:
        """Return ln of the circumferential radius in km."""
        return form.chebyshev(self.ln_radius, mass)

    def radius_km(self, mass: Any) -> Any:
        """Return the circumferential radius [km]."""
        return namespace(mass).exp(self.ln_radius_km(mass))

    def inertia_45(self, mass: Any) -> Any:
        """Return the moment of inertia [1e45 g cm^2]."""
        return namespace(mass).exp(form.chebyshev(self.ln_inertia, mass))

    def redshift_factor(self, mass: Any) -> Any:
        """Return sqrt(1 - 2GM/Rc^2): the rate of a clock on the star as seen from far away."""
        return structure.redshift_factor(mass, self.radius_km(mass))

    def gravity_14(self, mass: Any) -> Any:
        """Return the surface gravity [1e14 cm/s^2]."""
        return structure.surface_gravity_14(mass, self.radius_km(mass))


def read_scenario(path: Path) -> Scenario:
    """Read a scenario from its data file.

    Parameters
    ----------
    path : Path
        A TOML file as `write_scenario` makes it.

    Raises
    ------
    InputError
        If the file lacks a key or has coefficients of the wrong shape.
    """
    try:
        raw = tomllib.loads(path.read_text(encoding="utf-8"))
        table = np.zeros((2, len(form.PARAMETERS), form.DEGREE + 1))
        for branch, key in enumerate(("slow", "fast")):
            for row, values in raw.get(key, {}).items():
                table[branch, form.PARAMETERS.index(row)] = _padded(values)
        return Scenario(
            name=path.stem,
            title=raw["title"],
            description=raw["description"],
            sources=tuple(raw["sources"]),
            provisional=raw["provisional"],
            standard=raw.get("standard", False),
            weight=float(raw.get("weight", 1.0)),
            properties=raw.get("properties", {}),
            fit_error=raw.get("fit_error", {}),
            table=table,
            scalars=np.array([float(raw["scalars"][name]) for name in form.SCALARS]),
            ln_radius=_padded(raw["structure"]["ln_radius"]),
            ln_inertia=_padded(raw["structure"]["ln_inertia"]),
        )
    except (KeyError, ValueError, tomllib.TOMLDecodeError) as error:
        raise InputError(
            f"{path.name}: not a cooling scenario: {error!r}; write it with write_scenario"
        ) from error


def write_scenario(scenario: Scenario, path: Path) -> None:
    """Write a scenario as a data file that `read_scenario` reads back to the last bit."""
    lines = [
        f"title = {_text(scenario.title)}",
        f"description = {_text(scenario.description)}",
        f"sources = [{', '.join(_text(source) for source in scenario.sources)}]",
        f"provisional = {str(scenario.provisional).lower()}",
        f"standard = {str(scenario.standard).lower()}",
        f"weight = {scenario.weight!r}",
    ]
    lines += ["", "[properties]", *(f"{k} = {_text(v)}" for k, v in scenario.properties.items())]
    lines += ["", "[fit_error]", *(f"{k} = {float(v)!r}" for k, v in scenario.fit_error.items())]
    lines += ["", "[scalars]"]
    lines += [f"{k} = {float(v)!r}" for k, v in zip(form.SCALARS, scenario.scalars, strict=True)]
    lines += [
        "",
        "[structure]",
        f"ln_radius = {_row(scenario.ln_radius)}",
        f"ln_inertia = {_row(scenario.ln_inertia)}",
    ]
    for branch, key in enumerate(("slow", "fast")):
        rows = scenario.table[branch]
        if np.any(rows):
            lines += ["", f"[{key}]"]
            lines += [
                f"{name} = {_row(row)}"
                for name, row in zip(form.PARAMETERS, rows, strict=True)
                if np.any(row)
            ]
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")


def _padded(values: Any) -> NDArray[np.float64]:
    out = np.zeros(form.DEGREE + 1)
    out[: len(values)] = values
    return out


def _row(values: NDArray[np.float64]) -> str:
    return "[" + ", ".join(repr(float(value)) for value in values) + "]"


def _text(value: str) -> str:
    return '"' + value.replace("\\", "\\\\").replace('"', '\\"') + '"'
