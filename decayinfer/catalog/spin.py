"""Period and derivative of every row, from whichever pair of columns gives them."""

from collections.abc import Mapping, Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from decayinfer.catalog.cells import Cells
from decayinfer.catalog.columns import SPIN_PAIRS
from decayinfer.catalog.ledger import Ledger
from decayinfer.physics.constants import B_UNIT_G
from decayinfer.physics.torque import characteristic_age, dipole_field

__all__ = ["Spin", "read_spin", "swap"]

Floats = NDArray[np.float64]

_AGREE = 1e-3  # largest relative difference between the two ways of giving the spin
_OLD_YR = 1e7  # where the cooling curves end
_PERIODS_S = (1e-3, 100.0)  # outside the known spin periods of neutron stars, with room to spare


class Spin(NamedTuple):
    """Spin of every row; arrays of shape (n_row,), nan where unknown.

    Either period [s] and derivative [s/s] or frequency [Hz] and derivative [Hz/s], with their errors.
    """

    value: Floats
    derivative: Floats
    value_err: Floats
    derivative_err: Floats


def swap(spin: Spin) -> Spin:
    """Turn periods into frequencies or frequencies into periods, with first-order errors.

    1/x and -xdot/x^2 are their own inverse. Errors of value and derivative are taken as independent.
    """
    x, xdot, err, derr = spin
    return Spin(1 / x, -xdot / x**2, err / x**2, np.hypot(derr / x**2, 2 * xdot * err / x**3))


def read_spin(cells: Mapping[str, Cells], ledger: Ledger) -> tuple[Spin, Spin]:
    """Check the spin columns and put them together.

    Parameters
    ----------
    cells : mapping of str to Cells
        Columns by known name.
    ledger : Ledger
        Receives what is wrong.

    Returns
    -------
    period, frequency : Spin
        The same spin both ways; what was measured stands as it is, the period pair first.
    """
    for name in (name for pair in SPIN_PAIRS for name in pair):
        _check_sign(cells[name], ledger, negative=name == "frequency_derivative")
    by_period, by_frequency = (_pair(cells, *pair, ledger) for pair in SPIN_PAIRS)
    with np.errstate(all="ignore"):
        as_period, as_frequency = swap(by_frequency), swap(by_period)
        for name, other, a, b in zip(*SPIN_PAIRS, by_period[:2], as_period[:2], strict=True):
            _check_agreement(cells[name], cells[other], a, b, ledger)
        period = _first(by_period, as_period)
        frequency = _first(by_frequency, as_frequency)
        pair = next(pair for pair in SPIN_PAIRS if all(cells[name].raw is not None for name in pair))
        _check_missing([cells[name] for name in pair], period, ledger)
        _check_range(cells[pair[0]], period, ledger)
    return period, frequency


def _check_sign(cells: Cells, ledger: Ledger, *, negative: bool) -> None:
    ledger.refuse(cells.bad, cells, "must be a finite number", "correct the value or leave it blank")
    broken = cells.given & ((cells.values >= 0) if negative else (cells.values <= 0))
    word = "negative, since a pulsar spins down," if negative else "positive"
    ledger.refuse(broken, cells, f"must be {word}", "correct the value or remove the row")


def _pair(cells: Mapping[str, Cells], value: str, derivative: str, ledger: Ledger) -> Spin:
    errors = [_spin_error(cells[f"{name}_err"], ledger) for name in (value, derivative)]
    return Spin(cells[value].values, cells[derivative].values, *errors)


def _spin_error(cells: Cells, ledger: Ledger) -> Floats:
    """Return an error of the spin; one that is no use is dropped, since n hardly depends on it."""
    broken = cells.bad | (cells.given & (cells.values <= 0))
    ledger.flag(broken, cells, "value-ignored", "must be positive and finite to be used", "correct the error")
    return np.where(broken, np.nan, cells.values)


def _check_agreement(cells: Cells, other: Cells, a: Floats, b: Floats, ledger: Ledger) -> None:
    ledger.refuse(
        ~ledger.aside & (np.abs(b / a - 1) > _AGREE),
        cells,
        f"must agree with column {other.column} to {_AGREE:g}",
        "correct one of the two or leave it blank",
        lambda row: f"{a[row]:.8g} against {b[row]:.8g}",
    )


def _first(spin: Spin, other: Spin) -> Spin:
    """Take each row from the first pair where that is complete, from the other where not."""
    complete = np.isfinite(spin.value) & np.isfinite(spin.derivative)
    return Spin(*(np.where(complete, a, b) for a, b in zip(spin, other, strict=True)))


def _check_missing(pair: Sequence[Cells], period: Spin, ledger: Ledger) -> None:
    unknown = ~ledger.aside & ~(np.isfinite(period.value) & np.isfinite(period.derivative))
    for cells in pair:
        ledger.refuse(unknown & cells.absent, cells, "must be given", "fill the cell or remove the row")


def _check_range(cells: Cells, period: Spin, ledger: Ledger) -> None:
    age = characteristic_age(period.value, period.derivative)
    field = dipole_field(period.value, period.derivative) * B_UNIT_G
    sound = np.isfinite(age) & (age > 0) & np.isfinite(field) & (field > 0)

    def text(row: int) -> str:
        return f"P = {period.value[row]:.4g} s, Pdot = {period.derivative[row]:.4g}"

    remedy = "check value and unit"
    ledger.refuse(~sound & ~ledger.aside, cells, "must give a finite age and field", remedy, text)
    kept = ~ledger.aside
    outside = kept & ((period.value < _PERIODS_S[0]) | (period.value > _PERIODS_S[1]))
    ledger.flag(outside, cells, "period-range", "should lie between 1 ms and 100 s", remedy, text)
    ledger.flag(
        kept & (age > _OLD_YR),
        cells,
        "old",
        "characteristic age should be at most 10 Myr, where the cooling curves end",
        "read results for this object as extrapolated",
        lambda row: f"{age[row]:.3g} yr",
    )
