"""Choose NumPy or PyTensor by what a formula is given, so that each formula is written once.

Write constants as plain numbers or take them from NumPy: PyTensor evaluates ``pt.log(10.0)`` in single
precision, because it stores a bare literal in the smallest type that holds it; one beyond single range warns.
"""

from importlib import import_module
from typing import Any

import numpy as np

__all__ = ["Value", "namespace", "softplus"]

#: A float, a NumPy array or a PyTensor variable; formulas return the kind they are given.
type Value = Any


def namespace(*values: Value) -> Any:
    """Return the module whose ``exp``, ``sqrt``, ... fit the values.

    Parameters
    ----------
    *values : float, array or PyTensor variable
        The arguments of a formula.

    Returns
    -------
    module
        ``pytensor.tensor`` if any value is a PyTensor variable, else ``numpy``. PyTensor is imported only
        when a value already belongs to it.

    Examples
    --------
    >>> namespace(1.0, [2.0]).__name__
    'numpy'
    """
    if any(type(value).__module__.startswith("pytensor.") for value in values):
        return import_module("pytensor.tensor")
    return np


def softplus(xp: Any, z: Value) -> Value:
    """Return ln(1 + e^z) without overflow; xp is the module from `namespace`."""
    return xp.maximum(z, 0.0) + xp.log1p(xp.exp(-xp.abs(z)))
