"""Write plain values as TOML; the standard library only reads it."""

import json
from collections.abc import Mapping
from typing import Any

__all__ = ["to_toml"]


def to_toml(values: Mapping[str, Any], *, comment: str = "") -> str:
    """Return nested mappings of text, numbers, booleans and lists as TOML, without entries that are None.

    Examples
    --------
    >>> print(to_toml({"draws": 1000, "priors": {"mass": [1.0, 2.0]}}))
    draws = 1000
    <BLANKLINE>
    [priors]
    mass = [1.0, 2.0]
    <BLANKLINE>
    """
    lines = [f"# {line}" for line in comment.splitlines()] + _table(values, ())
    return "\n".join(lines).lstrip("\n") + "\n"


def _table(values: Mapping[str, Any], path: tuple[str, ...]) -> list[str]:
    plain = {k: v for k, v in values.items() if not isinstance(v, Mapping) and v is not None}
    tables = {k: v for k, v in values.items() if isinstance(v, Mapping)}
    header = ["", f"[{'.'.join(_key(part) for part in path)}]"] if path and (plain or not tables) else []
    lines = header + [f"{_key(key)} = {_value(value)}" for key, value in plain.items()]
    for key, value in tables.items():
        lines += _table(value, (*path, key))
    return lines


def _key(key: str) -> str:
    bare = key.isascii() and key.replace("_", "").replace("-", "").isalnum()
    return key if bare else _text(key)


def _value(value: Any) -> str:
    if isinstance(value, bool):
        return str(value).lower()
    if isinstance(value, str):
        return _text(value)
    if isinstance(value, list | tuple):
        return f"[{', '.join(_value(item) for item in value)}]"
    return repr(float(value) if isinstance(value, float) else int(value))  # also nan and inf


def _text(text: str) -> str:
    """Quote text: JSON's escapes are TOML's, but for DEL and for surrogates, which TOML cannot write."""
    safe = text.encode("utf-8", "replace").decode()
    return json.dumps(safe, ensure_ascii=False).replace("\x7f", "\\u007f")
