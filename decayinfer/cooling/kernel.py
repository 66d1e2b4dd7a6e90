"""Compiled twin of `decayinfer.cooling.form` that also returns the derivatives the field history needs.

A test holds the two together; the derivatives are those of the closed form, term by term.
"""

from typing import Any

import numpy as np
from numba import njit
from numpy.typing import NDArray

from decayinfer.cooling.form import DEGREE, FLOOR_SHARPNESS, PARAMETERS, POSITIVE, REFERENCE_AGE

__all__ = ["branch_values", "clock", "temperature_jet"]

_LOGGED = np.array([name in POSITIVE for name in PARAMETERS])
_SIZE = len(PARAMETERS)
_LN_REFERENCE = float(np.log(REFERENCE_AGE))
_COMPILE: dict[str, Any] = {"cache": True, "error_model": "numpy"}


@njit(**_COMPILE)
def clock(age: float, relaxation_time: float) -> tuple[float, float]:
    """Return x = ln[(t + t_r)/1e5 yr] and dx/d ln t."""
    return np.log(age + relaxation_time) - _LN_REFERENCE, age / (age + relaxation_time)


@njit(**_COMPILE)
def branch_values(table: NDArray[np.float64], mass: float) -> NDArray[np.float64]:
    """Evaluate every parameter of both branches at a mass: values and mass derivatives, shape (2, 2, 16)."""
    out = np.empty((2, 2, _SIZE))
    m = (mass - 1.5) / 0.5
    for branch in range(2):
        for i in range(_SIZE):
            # Chebyshev T_k and their derivatives k U_{k-1}, by recurrence
            t0, t1, d0, d1 = 1.0, m, 0.0, 1.0
            value = table[branch, i, 0] + table[branch, i, 1] * m
            slope = table[branch, i, 1]
            for k in range(2, DEGREE + 1):
                t0, t1, d0, d1 = t1, 2.0 * m * t1 - t0, d1, 2.0 * t1 + 2.0 * m * d1 - d0
                value += table[branch, i, k] * t1
                slope += table[branch, i, k] * d1
            slope /= 0.5
            if _LOGGED[i]:
                value = np.exp(value)
                slope *= value
            out[branch, 0, i] = value
            out[branch, 1, i] = slope
    return out


@njit(**_COMPILE)
def _soft_step(z: float) -> tuple[float, float]:
    """Sigmoid and softplus of z from one exponential."""
    e = np.exp(-abs(z))
    return (1.0 if z >= 0.0 else e) / (1.0 + e), max(z, 0.0) + np.log1p(e)


@njit(**_COMPILE)
def _branch(
    x: float, p: NDArray[np.float64], d: NDArray[np.float64], scalars: NDArray[np.float64]
) -> tuple[float, float, float, float, float]:
    """Y of one branch and its derivatives x, xx, M, xM."""
    y, y_x, y_xx = p[0] - p[1] * x, -p[1], 0.0
    y_m, y_xm = d[0] - d[1] * x, -d[1]
    for k in range(int(scalars[0])):
        s, c, w = p[2 + 3 * k], p[3 + 3 * k], p[4 + 3 * k]
        ds, dc, dw = d[2 + 3 * k], d[3 + 3 * k], d[4 + 3 * k]
        z = (x - c) / w
        g, sp = _soft_step(z)
        curve = g * (1.0 - g) / w
        z_m = -(dc + z * dw)  # w times dz/dM
        y -= s * w * sp
        y_x -= s * g
        y_xx -= s * curve
        y_m -= ds * w * sp + s * dw * sp + s * g * z_m
        y_xm -= ds * g + s * curve * z_m
    for j in range(int(scalars[1])):
        b, c, v = p[8 + 3 * j], p[9 + 3 * j], p[10 + 3 * j]
        db, dc, dv = d[8 + 3 * j], d[9 + 3 * j], d[10 + 3 * j]
        z = (x - c) / v
        g = _soft_step(z)[0]
        g1 = g * (1.0 - g)
        g2 = g1 * (1.0 - 2.0 * g)
        z_m = -(dc + z * dv) / v
        y -= b * g
        y_x -= b * g1 / v
        y_xx -= b * g2 / v**2
        y_m -= db * g + b * g1 * z_m
        y_xm -= (db * g1 + b * g2 * z_m - b * g1 * dv / v) / v
    if scalars[2] > 0.0:
        e = np.exp(p[14] * x - p[15])
        e_m = d[14] * x - d[15]
        y -= e
        y_x -= p[14] * e
        y_xx -= p[14] ** 2 * e
        y_m -= e * e_m
        y_xm -= d[14] * e + p[14] * e * e_m
    return y, y_x, y_xx, y_m, y_xm


@njit(**_COMPILE)
def temperature_jet(
    x: float, mass: float, values: NDArray[np.float64], scalars: NDArray[np.float64]
) -> tuple[float, float, float, float, float]:
    """Return ln T_b8 and its derivatives x, xx, M and xM.

    Parameters
    ----------
    x : float
        The clock, see `clock`.
    mass : float
        Mass [M_sun].
    values : (2, 2, 16) array
        From `branch_values` at the same mass.
    scalars : (10,) array
        As in `decayinfer.cooling.form.SCALARS`.
    """
    y, y_x, y_xx, y_m, y_xm = _branch(x, values[0, 0], values[0, 1], scalars)
    if scalars[3] > 0.0:
        f, f_x, f_xx, f_m, f_xm = _branch(x, values[1, 0], values[1, 1], scalars)
        p, slope, width = scalars[4], scalars[5], scalars[7]
        z = (mass - scalars[6]) / width
        # far below the threshold softplus(z) = e^z underflows, its logarithm is z
        if z > -30.0:
            g, sp = _soft_step(z)
            f -= slope * np.log(sp)
            f_m -= slope * g / (sp * width)
        else:
            f -= slope * z
            f_m -= slope / width
        fast, lowering = _soft_step(p * (y - f))
        slow = 1.0 - fast
        bend = p * slow * fast
        gap_x, gap_m = y_x - f_x, y_m - f_m
        y -= lowering / p
        y_xx = slow * y_xx + fast * f_xx - bend * gap_x**2
        y_xm = slow * y_xm + fast * f_xm - bend * gap_x * gap_m
        y_x = slow * y_x + fast * f_x
        y_m = slow * y_m + fast * f_m
    z = FLOOR_SHARPNESS * (y - scalars[8])
    above, height = _soft_step(z)
    bend = FLOOR_SHARPNESS * above * (1.0 - above)
    return (
        scalars[8] + height / FLOOR_SHARPNESS,
        above * y_x,
        above * y_xx + bend * y_x**2,
        above * y_m,
        above * y_xm + bend * y_x * y_m,
    )
