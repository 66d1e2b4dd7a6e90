"""What a catalogue implies before any fit."""

from typing import TYPE_CHECKING, Any

from decayinfer.catalog.catalog import Catalog

if TYPE_CHECKING:
    from astropy.table import Table

__all__ = ["summary_table"]

_COLUMNS = (
    ("name", None, "object"),
    ("characteristic_age", "yr", "P/(2 Pdot)"),
    (
        "field",
        "G",
        "equatorial field of an orthogonal vacuum rotator with R = 10 km, I = 1e45 g cm^2",
    ),
    ("braking_index", "", "given, or nu nuddot/nudot^2"),
    ("braking_index_err_minus", "", "one-sigma error below"),
    ("braking_index_err_plus", "", "one-sigma error above"),
    ("braking_index_limit", "", "upper limit"),
    ("decay_time", "yr", "4 tau_c/(n - 3) if decay of the field alone makes n; nan for n <= 3"),
    ("flags", None, "remarks of the reader"),
)


def summary_table(catalog: Catalog) -> "Table":
    """Return characteristic age, field, braking index and the decay time it implies.

    Parameters
    ----------
    catalog : Catalog
        What `read_table` returned.

    Returns
    -------
    astropy.table.Table
        A row per pulsar: name, characteristic_age [yr], field [G], braking_index, braking_index_err_minus,
        braking_index_err_plus, braking_index_limit, decay_time [yr], flags (joined by commas). Quantities
        that are unknown are nan; column descriptions state the conventions.
    """
    from astropy.table import Column, Table

    table = Table()
    for name, unit, description in _COLUMNS:
        values = [_value(pulsar, name) for pulsar in catalog.pulsars]
        dtype = str if unit is None else float
        table[name] = Column(values, unit=unit, description=description, dtype=dtype)
    table.meta["source"] = catalog.source
    return table


def _value(pulsar: Any, name: str) -> Any:
    if name == "flags":
        return ",".join(pulsar.flags)
    return getattr(pulsar, "dipole_field" if name == "field" else name)
