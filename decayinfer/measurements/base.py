"""What a further measurement of an object is: a value with errors, an interval or a limit, and its likelihood.

Each enters as one more factor of the likelihood. A value is a two-piece normal in the quoted quantity: a truth above
it is judged by the error above, one below it by the error below. A limit is a censored measurement, the probability
that what was measured fell on its side; an interval is a limit at each end.
"""

from abc import ABC, abstractmethod
from dataclasses import dataclass, field
from typing import Any, ClassVar, NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.special import log_ndtr, ndtr

from decayinfer.errors import InputError

__all__ = ["Measurement", "State", "two_piece_below"]

type Array = NDArray[np.float64]

_LN_2PI = float(np.log(2.0 * np.pi))
_SOFT = 0.05  # one-sigma width of an edge that is quoted without an error, relative to its size
_SOFT_INTERVAL = 0.1  # and at most this share of an interval


class State(NamedTuple):
    """What stars are like today, arrays of shape (n,).

    Attributes
    ----------
    age : array [yr]
    mass : array [M_sun]
    crust_temperature : array [K]
        Local temperature at the base of the envelope.
    surface_temperature : array [K]
        Effective temperature, redshifted to infinity.
    luminosity : array [erg/s]
        Thermal luminosity, redshifted to infinity.
    obliquity : array [deg] or None
        Angle between spin and magnetic axis, 0 to 90; None where the channel says nothing about it.
    braking_index : array
    """

    age: Array
    mass: Array
    crust_temperature: Array
    surface_temperature: Array
    luminosity: Array
    obliquity: Array | None
    braking_index: Array


@dataclass(frozen=True, kw_only=True)
class Measurement(ABC):
    """A measured value, an interval or a limit.

    A subclass gives ``name``, ``unit``, ``title``, the range and `predicted`; that and a line in
    `decayinfer.measurements.registry` make the column ``name`` and those of its errors and limits.

    Attributes
    ----------
    value : float
        Measured value; nan for an interval or a limit.
    err_minus, err_plus : float
        One-sigma errors below and above the value; for limits, how sharp the lower and the upper edge are (5 % of
        the edge and at most a tenth of an interval when nan).
    lower, upper : float
        Limits; nan where there is none.
    name : str
        Registry name and column.

    Raises
    ------
    InputError
        If there is neither value nor limit or both, no positive error of a value, or a number out of range.
    """

    value: float = np.nan
    err_minus: float = np.nan
    err_plus: float = np.nan
    lower: float = np.nan
    upper: float = np.nan
    name: str = field(default="", init=False)

    unit: ClassVar[str]  #: of value, errors and limits, as astropy writes it
    title: ClassVar[str]  #: plain words
    low: ClassVar[float] = 0.0  #: values lie above this,
    high: ClassVar[float] = np.inf  #: or, where this is finite, between the two

    def __post_init__(self) -> None:
        limits = [edge for edge in (self.lower, self.upper) if np.isfinite(edge)]
        if np.isfinite(self.value) == bool(limits):
            self._refuse("give either a value with its errors or limits")
        if np.isfinite(self.value) and not (self.err_minus > 0.0 and self.err_plus > 0.0):
            self._refuse("a value needs positive errors err_minus and err_plus")
        if not self.inside(np.array(limits or [self.value])).all():
            self._refuse(f"must be {self.range_text()}")
        if self.lower >= self.upper:
            self._refuse("the lower limit must be below the upper one")

    def __str__(self) -> str:
        """Return the measurement in words."""
        return " ".join(filter(None, (self.title, self._numbers(), self.unit)))

    @classmethod
    def columns(cls) -> dict[str, str]:
        """Return the columns that are read, with the unit each has when the table states none."""
        ends = ("", "_err", "_err_minus", "_err_plus", "_min", "_max")
        return {f"{cls.__dataclass_fields__['name'].default}{end}": cls.unit for end in ends}

    @classmethod
    def inside(cls, values: Array) -> NDArray[np.bool_]:
        """Tell which values are possible: positive ones, or those between the ends of a bounded range."""
        if np.isfinite(cls.high):
            return np.asarray((values >= cls.low) & (values <= cls.high))
        return np.asarray(values > cls.low)

    @classmethod
    def range_text(cls) -> str:
        """Return the range of values in words."""
        if np.isfinite(cls.high):
            return f"between {cls.low:g} and {cls.high:g} {cls.unit}"
        return "positive" if cls.low == 0.0 else f"above {cls.low:g} {cls.unit}"

    @abstractmethod
    def predicted(self, state: State) -> Array | None:
        """Return what would be measured without error, (n,); None where a state says nothing about it."""

    def ln_likelihood(self, state: State) -> Array:
        """Return ln p(measurement | state), (n,); minus infinity where the prediction is no number."""
        predicted = self.predicted(state)
        if predicted is None:
            return np.full(state.age.shape, self._ln_unpredicted())
        return self._ln_density(predicted)

    def tail(self, predicted: Array, weights: Array) -> float:
        """Return how surprising the measurement is under weighted predictions.

        Parameters
        ----------
        predicted, weights : (n,) arrays
            Predictions, and weights that sum to one.

        Returns
        -------
        float
            Two-sided probability that a repetition falls as far out as the value; for a limit, the probability that
            it is obeyed; for an interval, twice the smaller of those of its ends, at most 1.
        """
        sides = [float(np.sum(weights * side)) for side in self._sides(predicted)]
        return min(1.0, len(sides) * min(sides))

    def _ln_density(self, x: Array) -> Array:
        if np.isfinite(self.value):
            gap = x - self.value
            z = gap / np.where(gap > 0.0, self.err_plus, self.err_minus)
            total = -0.5 * z**2 - np.log(0.5 * (self.err_minus + self.err_plus)) - 0.5 * _LN_2PI
        else:
            total = np.zeros_like(x)
            for edge, width, sign in self._edges():
                total = total + log_ndtr(sign * (x - edge) / width)
        return np.where(np.isfinite(x) & ~np.isnan(total), total, -np.inf)

    def _ln_unpredicted(self) -> float:
        """Likelihood of a state that says nothing: the same for all, which leaves everything as it was."""
        return 0.0

    def _edges(self) -> list[tuple[float, float, float]]:
        """Each limit with its width, and the sign of the side that is allowed."""
        least = _SOFT_INTERVAL * (self.upper - self.lower)
        edges = (self.lower, self.err_minus, 1.0), (self.upper, self.err_plus, -1.0)
        return [
            (edge, width if np.isfinite(width) else float(np.fmin(_SOFT * abs(edge), least)), sign)
            for edge, width, sign in edges
            if np.isfinite(edge)
        ]

    def _sides(self, x: Array) -> list[Array]:
        """Probabilities that a repetition lies below the value and above it, or on the right side of each limit."""
        if not np.isfinite(self.value):
            return [ndtr(sign * (x - edge) / width) for edge, width, sign in self._edges()]
        below = two_piece_below(self.value, x, self.err_minus, self.err_plus)
        return [below, 1.0 - below]

    def _numbers(self) -> str:
        value, lower, upper = (_digits(x, 4) for x in (self.value, self.lower, self.upper))
        minus, plus = _digits(self.err_minus, 2), _digits(self.err_plus, 2)
        if np.isfinite(self.value):
            return f"{value} ± {plus}" if self.err_minus == self.err_plus else f"{value} +{plus} -{minus}"
        if np.isfinite(self.lower):
            return f"{lower} to {upper}" if np.isfinite(self.upper) else f"> {lower}"
        return f"< {upper}"

    def _refuse(self, rule: str) -> None:
        raise InputError(
            f"{self.name}: {rule}, got {self._numbers()} [{self.unit}]; remedy: correct the measurement"
        )


def two_piece_below(value: float, truth: Array, err_minus: Any, err_plus: Any) -> Array:
    """Return how probable it is that a measurement falls below a value.

    A measurement lies below the truth with the weight of the error above it, and the other way round.

    Parameters
    ----------
    value : float
        The value.
    truth : array
        What is measured.
    err_minus, err_plus : float or array that broadcasts
        One-sigma errors below and above the measured value.
    """
    total = err_minus + err_plus
    beyond = 2.0 * err_plus / total * ndtr((value - truth) / err_plus)
    short = 2.0 * err_minus / total * ndtr((truth - value) / err_minus)
    below: Array = np.where(truth > value, beyond, 1.0 - short)
    return below


def _digits(value: float, digits: int) -> str:
    """Return significant digits, without an exponent where that stays short."""
    text = f"{value:.{digits}g}"
    return f"{value:.0f}" if "e+" in text and abs(value) < 1e7 else text
