"""The columns a table may have, and how a user's own names map to them."""

from collections.abc import Collection, Iterable, Mapping, Sequence
from difflib import get_close_matches

from decayinfer.errors import InputError
from decayinfer.measurements import MEASUREMENTS

__all__ = [
    "COLUMNS",
    "INDEX_SOURCES",
    "KNOWN",
    "SPIN_PAIRS",
    "check_required",
    "map_columns",
    "nearest",
    "value_of",
]

_QUANTITIES = {
    "period": "s",
    "period_derivative": "",
    "frequency": "Hz",
    "frequency_derivative": "Hz/s",
    "frequency_second_derivative": "Hz/s^2",
    "braking_index": "",
}

#: Columns of numbers, each with the unit it has when the table states none.
COLUMNS = {
    **_QUANTITIES,
    **{f"{name}_err": unit for name, unit in _QUANTITIES.items()},
    "braking_index_err_minus": "",
    "braking_index_err_plus": "",
    "braking_index_limit": "",
    **{name: unit for kind in MEASUREMENTS.values() for name, unit in kind.columns().items()},
    "data_span": "yr",
    "glitch_nudot_step": "",
    "glitch_time_since": "yr",
    "spin_noise_log10_scale": "",
    "spin_noise_log10_scale_err": "",
}

#: Every column, those of text included.
KNOWN = ("name", *COLUMNS, "index_kind")

#: Either pair gives the spin.
SPIN_PAIRS = (("period", "period_derivative"), ("frequency", "frequency_derivative"))

#: Any of these sets of columns says something about the braking index.
INDEX_SOURCES = (
    ("braking_index", "braking_index_err"),
    ("braking_index", "braking_index_err_minus", "braking_index_err_plus"),
    ("frequency_second_derivative", "frequency_second_derivative_err"),
    ("braking_index_limit",),
)


def value_of(name: str) -> str:
    """Return the column that a column of errors or limits belongs to, or the column itself."""
    return name.partition("_err")[0].removesuffix("_min").removesuffix("_max")


def nearest(name: str, among: Iterable[str], cutoff: float = 0.6) -> str | None:
    """Return the spelling nearest to a name, ignoring case; None when nothing is near."""
    folded = {other.casefold(): other for other in among}
    found = get_close_matches(name.casefold(), folded, n=1, cutoff=cutoff)
    return folded[found[0]] if found else None


def map_columns(source: str, found: Sequence[str], columns: Mapping[str, str] | None) -> dict[str, str]:
    """Map the known column names to those of the table.

    Parameters
    ----------
    source : str
        Name of the table, for messages.
    found : sequence of str
        Column names of the table.
    columns : mapping of str to str, optional
        Known name to the table's own name; known names left out stand for themselves.

    Returns
    -------
    dict of str to str
        Known name to the table's own name, for the columns that are there.

    Raises
    ------
    InputError
        When a known name is unknown or the table lacks its counterpart.
    """
    mapped = {name: name for name in KNOWN if name in found}
    for ours, theirs in (columns or {}).items():
        if ours not in KNOWN:
            hint = nearest(str(ours), KNOWN)
            raise InputError(
                f"{source}: column mapping {ours}={theirs}: there is no quantity {ours!r}"
                + (f", did you mean {hint!r}?" if hint else f"; choose from: {', '.join(KNOWN)}")
            )
        if theirs not in found:
            raise InputError(
                f"{source}: column mapping {ours}={theirs}: the table has no column {theirs!r}; "
                + _what_is_there([str(theirs)], found)
            )
        mapped[ours] = theirs
    return mapped


def check_required(source: str, found: Sequence[str], mapped: Mapping[str, str]) -> list[str]:
    """Check that a table can be used at all.

    Parameters
    ----------
    source : str
        Name of the table, for messages.
    found : sequence of str
        Column names of the table.
    mapped : mapping of str to str
        As `map_columns` returns.

    Returns
    -------
    list of str
        Known names of columns that cannot be used because their partner is missing.

    Raises
    ------
    InputError
        When there is no name, no complete spin pair, or nothing about the braking index.
    """
    _need_one(source, found, mapped, [("name",)])
    spin = _need_one(source, found, mapped, SPIN_PAIRS)
    index = _need_one(source, found, mapped, INDEX_SOURCES)
    used = spin | {f"{name}_err" for name in spin} | index
    parts = {name for group in (*SPIN_PAIRS, *INDEX_SOURCES) for name in group}
    parts |= {f"{name}_err" for pair in SPIN_PAIRS for name in pair}
    return [name for name in mapped if name in parts - used]


def _need_one(
    source: str, found: Sequence[str], mapped: Mapping[str, str], groups: Sequence[tuple[str, ...]]
) -> set[str]:
    """Return the columns of every complete group, of which there must be one."""
    complete = {name for group in groups if all(part in mapped for part in group) for name in group}
    if complete:
        return complete
    missing = list(dict.fromkeys(name for group in groups for name in group if name not in mapped))
    wanted = ", or ".join(first + (f" with {' and '.join(rest)}" if rest else "") for first, *rest in groups)
    raise InputError(
        f"{source}: the table needs column {wanted}; " + _what_is_there(missing, found, set(mapped.values()))
    )


def _what_is_there(missing: Sequence[str], found: Sequence[str], taken: Collection[str] = ()) -> str:
    """List the columns of a table, and which of those not taken are spelt like the missing ones."""
    free = [name for name in found if name not in taken]
    pairs = ((name, nearest(name, free)) for name in missing)
    hints = [f"{theirs!r} for {ours}" for ours, theirs in pairs if theirs]
    near = f" (nearest: {', '.join(hints)})" if hints else ""
    return (
        f"it has {', '.join(map(repr, found))}{near}; "
        "remedy: rename the column or map it, as in --column period=THEIRS"
    )
