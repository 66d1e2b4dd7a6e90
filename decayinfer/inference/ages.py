"""The prior of the age: a constant birth rate, tapered where the cooling fits end."""

from typing import Any

import numpy as np

from decayinfer.physics.namespace import namespace, softplus

__all__ = ["AGE_TAPER", "ln_age_density"]

#: The prior is flat with a taper 1/(1 + (t/T)^8) about the largest age T, soft enough for a sampler to follow.
AGE_TAPER = 8.0

_LN_NORM = float(np.log(np.pi / AGE_TAPER / np.sin(np.pi / AGE_TAPER)))  # integral of the taper over t/T


def ln_age_density(ln_age: Any, ln_largest: Any) -> Any:
    """Return ln of the prior density per year of age.

    Parameters
    ----------
    ln_age : float, array or PyTensor variable
        ln of the age [yr].
    ln_largest : float or PyTensor variable
        ln of the largest age [yr].
    """
    xp = namespace(ln_age, ln_largest)
    return -ln_largest - _LN_NORM - softplus(xp, AGE_TAPER * (ln_age - ln_largest))
