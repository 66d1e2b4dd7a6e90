"""The closed form of `decayinfer.cooling.form` with its derivatives by every coefficient, for fitting.

Values and slopes in ln t on a grid of masses by ages; a test holds both to the form and to finite
differences.
"""

from dataclasses import dataclass

import numpy as np
from numpy.polynomial.chebyshev import chebvander
from numpy.typing import NDArray
from scipy.special import expit

from decayinfer.cooling import form

__all__ = ["Grid", "Layout", "evaluate"]

type Array = NDArray[np.float64]

_ROW = {name: i for i, name in enumerate(form.PARAMETERS)}
_SCALAR = {name: i for i, name in enumerate(form.SCALARS)}
_LOGARITHMIC = frozenset({"sharpness", "urca_slope", "urca_width"})  # fitted by their logarithm


@dataclass(frozen=True, eq=False)
class Grid:
    """Masses [M_sun] and ages [yr] on which the form is evaluated."""

    mass: Array
    age: Array

    @property
    def basis(self) -> Array:
        """Chebyshev polynomials in m, (n_mass, degree + 1)."""
        return np.asarray(chebvander((self.mass - 1.5) / 0.5, form.DEGREE), dtype=float)


@dataclass(frozen=True)
class Layout:
    """Which coefficients a fit moves, and the vector they make.

    Parameters
    ----------
    rows : tuple of (int, str)
        Branch (0 slow, 1 fast) and name of each row of the coefficient table; all its polynomial moves.
    scalars : tuple of str
        Scalars that move.
    degrees : (int, int)
        Degree in mass of the rows of the slow and of the fast branch; the fast one rules over half the
        masses, and a polynomial of full degree would swing wildly over the other half.
    """

    rows: tuple[tuple[int, str], ...]
    scalars: tuple[str, ...] = ()
    degrees: tuple[int, int] = (form.DEGREE, form.DEGREE)

    def pack(self, table: Array, scalars: Array) -> Array:
        """Vector of the moving coefficients."""
        parts = [table[branch, _ROW[name], : self.degrees[branch] + 1] for branch, name in self.rows]
        parts += [self._coded(name, scalars[_SCALAR[name]]) for name in self.scalars]
        return np.concatenate(parts)

    def unpack(self, vector: Array, table: Array, scalars: Array) -> tuple[Array, Array]:
        """Copies of table and scalars with the moving coefficients replaced."""
        table, scalars = table.copy(), scalars.copy()
        at = 0
        for branch, name in self.rows:
            width = self.degrees[branch] + 1
            table[branch, _ROW[name], :width] = vector[at : at + width]
            at += width
        for name, value in zip(self.scalars, vector[at:], strict=True):
            scalars[_SCALAR[name]] = np.exp(value) if name in _LOGARITHMIC else value
        return table, scalars

    @staticmethod
    def _coded(name: str, value: float) -> Array:
        return np.array([np.log(value) if name in _LOGARITHMIC else value])


def evaluate(grid: Grid, table: Array, scalars: Array, layout: Layout) -> tuple[Array, Array, Array, Array]:
    """Evaluate the form and its derivatives.

    Parameters
    ----------
    grid : Grid
        Where.
    table, scalars : array
        As `form.ln_temperature` takes them.
    layout : Layout
        Coefficients to differentiate by.

    Returns
    -------
    value, slope : (n_mass, n_age) array
        ln T_b8 and d ln T_b8 / d ln t.
    d_value, d_slope : (n_mass, n_age, n_coefficient) array
        Their derivatives by the vector of `Layout.pack`.
    """
    named = dict(zip(form.SCALARS, scalars, strict=True))
    x = np.log((grid.age + named["relaxation_time"]) / form.REFERENCE_AGE)
    stretch = grid.age / (grid.age + named["relaxation_time"])  # dx / d ln t
    basis = grid.basis
    active = [[name for b, name in layout.rows if b == branch] for branch in (0, 1)]
    y, y_x, d, d_x = _branch(x, basis, table[0], named, active[0], layout.degrees[0])
    if named["direct_urca"]:
        fast = _branch(x, basis, table[1], named, active[1], layout.degrees[1])
        y, y_x, d, d_x = _join((y, y_x, d, d_x), fast, grid.mass, named, layout.scalars)
    return _floored(y, y_x * stretch, d, d_x * stretch[:, None], named["ln_floor"])


type _Jet = tuple[Array, Array, Array, Array]


def _branch(
    x: Array, basis: Array, rows: Array, named: dict[str, float], active: list[str], degree: int
) -> _Jet:
    """Value and x-slope of one branch, and derivatives by its active rows."""
    theta, moving = rows @ basis.T, basis[:, : degree + 1]
    v = {
        n: np.exp(t) if n in form.POSITIVE else t
        for n, t in zip(form.PARAMETERS, theta[:, :, None], strict=True)
    }
    d: dict[str, tuple[Array, Array]] = {}
    one = np.ones((basis.shape[0], x.size))
    y, y_x = v["a0"] - v["s0"] * x, -v["s0"] * one
    d["a0"], d["s0"] = (one, 0 * one), (-v["s0"] * x, y_x)
    for k in range(1, int(named["softplus_terms"]) + 1):
        s, w = v[f"s{k}"], v[f"w{k}"]
        z = (x - v[f"l{k}"]) / w
        soft, sig = np.logaddexp(0, z), expit(z)
        bell = sig * (1 - sig)
        y, y_x = y - s * w * soft, y_x - s * sig
        d[f"s{k}"], d[f"l{k}"] = (-s * w * soft, -s * sig), (s * sig, s * bell / w)
        d[f"w{k}"] = (-s * w * (soft - z * sig), s * bell * z)
    for j in range(1, int(named["sigmoid_terms"]) + 1):
        b, width = v[f"b{j}"], v[f"v{j}"]
        z = (x - v[f"c{j}"]) / width
        sig = expit(z)
        bell = sig * (1 - sig)
        curl = bell * (1 - 2 * sig)
        y, y_x = y - b * sig, y_x - b * bell / width
        d[f"b{j}"], d[f"c{j}"] = (-b * sig, -b * bell / width), (b * bell / width, b * curl / width**2)
        d[f"v{j}"] = (b * bell * z, b * (bell + curl * z) / width)
    if named["exponential_term"]:
        beta = v["beta"]
        e = np.exp(np.minimum(beta * x - v["q"], 50.0))
        y, y_x = y - e, y_x - beta * e
        d["beta"], d["q"] = (-e * beta * x, -beta * e * (1 + beta * x)), (e, beta * e)
    return y, y_x, _spread(d, active, moving, 0), _spread(d, active, moving, 1)


def _spread(d: dict[str, tuple[Array, Array]], active: list[str], basis: Array, which: int) -> Array:
    """Chain rule from local parameters to Chebyshev coefficients."""
    n_mass, n_age = d["a0"][0].shape
    local = np.array([d[name][which] for name in active]).reshape(-1, n_mass, n_age)
    return np.asarray(np.einsum("rma,mk->mark", local, basis).reshape(n_mass, n_age, -1))


def _join(slow: _Jet, fast: _Jet, mass: Array, named: dict[str, float], moving: tuple[str, ...]) -> _Jet:
    """Soft minimum of the slow and the direct-Urca branch."""
    p, g, w_d = named["sharpness"], named["urca_slope"], named["urca_width"]
    z = ((mass - named["urca_mass"]) / w_d)[:, None]
    soft, sig = np.logaddexp(0, z), expit(z)
    y_s, x_s, d_s, dx_s = slow
    y_f, x_f, d_f, dx_f = fast
    y_f = y_f - g * np.log(soft)
    y = -np.logaddexp(-p * y_s, -p * y_f) / p
    share = np.exp(p * (y - y_s))  # weight of the slow branch; the fast one has the rest
    both, difference = share * (1 - share), x_s - x_f
    by_slow, by_fast = share[..., None], (1 - share)[..., None]
    bend = (p * both * difference)[..., None]
    d_value = [by_slow * d_s, by_fast * d_f]
    d_slope = [by_slow * dx_s - bend * d_s, by_fast * dx_f + bend * d_f]
    lift = {
        "urca_slope": -g * np.log(soft),
        "urca_mass": g * sig / (soft * w_d),
        "urca_width": g * sig * z / soft,
    }
    for name in moving:
        if name == "sharpness":
            d_value.append((share * y_s + (1 - share) * y_f - y)[..., None])
            d_slope.append((p * both * (y_f - y_s) * difference)[..., None])
        else:
            d_value.append(by_fast * lift[name][..., None])
            d_slope.append(bend * lift[name][..., None])
    return y, share * x_s + (1 - share) * x_f, np.concatenate(d_value, -1), np.concatenate(d_slope, -1)


def _floored(y: Array, slope: Array, d: Array, d_slope: Array, floor: float) -> _Jet:
    z = form.FLOOR_SHARPNESS * (y - floor)
    sig = expit(z)
    bend = form.FLOOR_SHARPNESS * sig * (1 - sig) * slope
    value = floor + np.logaddexp(0, z) / form.FLOOR_SHARPNESS
    return value, sig * slope, sig[..., None] * d, sig[..., None] * d_slope + bend[..., None] * d
