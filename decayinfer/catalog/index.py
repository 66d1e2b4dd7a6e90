"""Braking index of every row: given, from the second derivative, or an upper limit."""

from collections.abc import Mapping, Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from decayinfer.catalog.cells import Cells
from decayinfer.catalog.ledger import Ledger, Rows
from decayinfer.catalog.spin import Spin
from decayinfer.physics.torque import index_from_frequency

__all__ = ["Index", "index_and_error", "read_index"]

Floats = NDArray[np.float64]

_SIGMA = 3.0  # two values of n further apart than this disagree
_LARGE = 10.0  # an error of n above this and above |n| says next to nothing


class Index(NamedTuple):
    """What is known of n in every row; arrays of shape (n_row,), nan where unknown."""

    value: Floats
    err_minus: Floats
    err_plus: Floats
    limit: Floats


def index_and_error(frequency: Spin, second: Floats, second_err: Floats) -> tuple[Floats, Floats]:
    """Return n = nu nuddot/nudot^2 and its first-order error.

    Parameters
    ----------
    frequency : Spin
        Frequency [Hz], derivative [Hz/s] and their errors; an error that is not given counts as zero.
    second, second_err : (n_row,) array of float
        Second derivative of the frequency and its error [Hz/s^2].

    Returns
    -------
    n, err : (n_row,) array of float
        Braking index and error; the errors of the three inputs are taken as independent.
    """
    nu, nudot, nu_err, nudot_err = frequency
    n = index_from_frequency(nu, nudot, second)
    by_second = index_from_frequency(nu, nudot, second_err)
    by_nu, by_nudot = n * np.nan_to_num(nu_err) / nu, 2 * n * np.nan_to_num(nudot_err) / nudot
    return n, np.hypot(by_second, np.hypot(by_nu, by_nudot))


def read_index(cells: Mapping[str, Cells], frequency: Spin, ledger: Ledger) -> Index:
    """Check the columns about n and choose what each row is fitted to.

    A given index comes before one from the second derivative, and that before an upper limit.

    Parameters
    ----------
    cells : mapping of str to Cells
        Columns by known name.
    frequency : Spin
        Frequency and derivative of each row.
    ledger : Ledger
        Receives what is wrong.

    Returns
    -------
    Index
        A measured n with errors, or a limit, for every row that is not set aside.
    """
    n, second, limit = (
        cells[name] for name in ("braking_index", "frequency_second_derivative", "braking_index_limit")
    )
    minus, plus = (_side(cells, side, ledger) for side in ("minus", "plus"))
    second_err = _second_error(cells, n.given, ledger)
    with np.errstate(all="ignore"):
        derived, derived_err = index_and_error(frequency, second.values, second_err)
    use_second = ~n.given & second.given
    _check_numbers(n, second, limit, ledger)
    sound = np.isfinite(derived) & np.isfinite(derived_err) & (derived_err > 0)
    _check_derived(second, use_second & ~sound, derived, ledger)
    _check_mismatch(n, minus, plus, derived, derived_err, ledger)
    value = np.where(use_second, derived, n.values)
    err_minus, err_plus = (np.where(use_second, derived_err, side) for side in (minus, plus))
    measured = np.isfinite(value)
    _check_limit(limit, measured, ledger)
    for source, rows in ((n, n.given), (second, use_second)):
        _check_size(source, rows, value, 0.5 * err_minus + 0.5 * err_plus, ledger)
    _check_any((n, second, limit), ledger)
    return Index(value, err_minus, err_plus, np.where(measured, np.nan, limit.values))


def _side(cells: Mapping[str, Cells], side: str, ledger: Ledger) -> Floats:
    """Return the error on one side of a given n: its own column first, then the symmetric one."""
    needed = cells["braking_index"].given
    own, both = cells[f"braking_index_err_{side}"], cells["braking_index_err"]
    blame = both if own.raw is None else own
    if side == "minus" or blame is own:  # what both sides share is blamed once
        rule, remedy = "must be given where there is a braking index", "fill the cell or blank the index"
        ledger.refuse(needed & own.absent & both.absent, blame, rule, remedy)
    if side == "minus":
        _check_error(both, needed & _one_sided(cells), ledger)
    _check_error(own, needed, ledger)
    return np.where(own.given, own.values, both.values)


def _one_sided(cells: Mapping[str, Cells]) -> Rows:
    """Return the rows in which at least one side has no error of its own."""
    return np.asarray(cells["braking_index_err_minus"].absent | cells["braking_index_err_plus"].absent)


def _check_error(cells: Cells, needed: Rows, ledger: Ledger) -> None:
    broken = needed & (cells.bad | (cells.given & (cells.values <= 0)))
    ledger.refuse(broken, cells, "must be a positive, finite number", "give the size of the one-sigma error")


def _second_error(cells: Mapping[str, Cells], other: Rows, ledger: Ledger) -> Floats:
    """Return the error of the second derivative, which is needed where there is no other index."""
    second, err = cells["frequency_second_derivative"], cells["frequency_second_derivative_err"]
    needed = second.given & ~other
    _check_error(err, needed, ledger)
    ledger.refuse(
        needed & err.absent,
        err,
        "must be given where there is a second derivative",
        "fill the cell or blank the derivative",
    )
    broken = second.given & other & (err.bad | (err.values <= 0))
    rule = "must be positive and finite to be used"
    ledger.flag(broken, err, "value-ignored", rule, "give the size of the one-sigma error")
    return np.where(err.values > 0, err.values, np.nan)


def _check_numbers(n: Cells, second: Cells, limit: Cells, ledger: Ledger) -> None:
    """Refuse what is no number where it would be used, set it down as ignored where not."""
    taken = np.zeros_like(n.given)
    for cells in (n, second, limit):
        rule = "must be a finite number"
        ledger.refuse(cells.bad & ~taken, cells, rule, "correct the value or leave it blank")
        ledger.flag(cells.bad & taken, cells, "value-ignored", rule, "correct the value or leave it blank")
        taken = taken | cells.given


def _check_derived(second: Cells, broken: Rows, derived: Floats, ledger: Ledger) -> None:
    rows = broken & ~ledger.aside
    ledger.refuse(
        rows,
        second,
        "must give a finite braking index with an error",
        "check value and unit",
        lambda row: f"n = {derived[row]:.4g}",
    )


def _check_mismatch(
    n: Cells, minus: Floats, plus: Floats, derived: Floats, derived_err: Floats, ledger: Ledger
) -> None:
    with np.errstate(all="ignore"):
        sigma = np.hypot(np.where(derived > n.values, plus, minus), derived_err)
        rows = ~ledger.aside & (np.abs(n.values - derived) > _SIGMA * sigma)

    def got(row: int) -> str:
        return f"{n.values[row]:.4g} against {derived[row]:.4g}"

    rule = "should agree with the index from the second derivative within 3 sigma"
    ledger.flag(
        rows, n, "index-mismatch", rule, "the given index was used; correct it or the derivative", got
    )


def _check_limit(limit: Cells, measured: Rows, ledger: Ledger) -> None:
    rows = limit.given & measured & ~ledger.aside
    rule = "an upper limit should stand where there is no measured index"
    ledger.flag(rows, limit, "value-ignored", rule, "the measured index was used; blank one of the two")


def _check_any(sources: Sequence[Cells], ledger: Ledger) -> None:
    nothing = np.logical_and.reduce([cells.absent for cells in sources])
    ledger.refuse(
        nothing,
        next(cells for cells in sources if cells.raw is not None),
        "there must be an index, a second derivative or an upper limit",
        "fill one of them or remove the row",
        lambda _: "nothing to fit",
    )


def _check_size(cells: Cells, rows: Rows, value: Floats, err: Floats, ledger: Ledger) -> None:
    with np.errstate(all="ignore"):
        rows = rows & ~ledger.aside & (err > np.maximum(np.abs(value), _LARGE))

    def got(row: int) -> str:
        return f"{value[row]:.4g} +- {err[row]:.4g}"

    rule = "error should not exceed both the index and 10"
    ledger.flag(
        rows, cells, "large-index-error", rule, "check the error; the fit learns next to nothing", got
    )
