"""Quadrature in stretched time: Gauss-Radau nodes on [0, 1] that include birth, and cumulative integrals.

Ages are s = t sigma(u) with sigma(u) = (e^{Lu} - 1)/(e^L - 1), which spends the nodes evenly in ln s except near
birth. Because the stretch scales with t, the nodes and weights are constants. Birth is a node so that the integral of
b^2 diverges, as it must, when the field at birth does; every root of the age equation then has a finite birth field.
"""

from functools import cache
from typing import NamedTuple

import numpy as np
from numpy.polynomial import legendre
from numpy.typing import NDArray

__all__ = ["NODES", "STRETCH", "Quadrature", "quadrature", "radau"]

#: With this stretch, histories agree with an adaptive solver to better than 1e-6; where neutron triplet pairing sets in
#: within a tenth of ln t, to 6e-3.
NODES = 36
STRETCH = 6.5  #: L; the first node interval is about e^-L of the age


class Quadrature(NamedTuple):
    """Constants of the history integrals, ages in units of the present age.

    Attributes
    ----------
    sigma : (n,) array
        Node ages; the first is zero.
    weights : (n,) array
        Weights of the integral over the whole life.
    to_now : (n, n) array
        ``to_now[i, j]`` is the weight of node j in the integral from node i to now.
    """

    sigma: NDArray[np.float64]
    weights: NDArray[np.float64]
    to_now: NDArray[np.float64]


def radau(n: int) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return the n Radau nodes on [0, 1] with 0 among them, and the matrix of integrals from each node to 1.

    The free nodes are zeros of P_{n-1} + P_n (Abramowitz & Stegun 1964, 25.4.31); row i of the matrix integrates
    the Lagrange polynomials from node i to 1 through their Legendre expansion.
    """
    target = np.zeros(n + 1)
    target[n - 1 :] = 1.0
    x = np.sort(legendre.legroots(target).real)
    x[0] = -1.0
    for _ in range(3):  # Newton: the companion-matrix roots carry 1e-13 errors
        x[1:] -= legendre.legval(x[1:], target) / legendre.legval(x[1:], legendre.legder(target))
    p = legendre.legvander(x, n)
    k = np.arange(1, n)
    integrals = np.column_stack([1.0 - x, (p[:, k - 1] - p[:, k + 1]) / (2 * k + 1)])
    return (x + 1.0) / 2.0, integrals @ np.linalg.inv(p[:, :n]) / 2.0


@cache
def quadrature(n: int = NODES, stretch: float = STRETCH) -> Quadrature:
    """Return the nodes and weights of the history integrals."""
    u, matrix = radau(n)
    density = stretch * np.exp(stretch * u) / np.expm1(stretch)
    to_now = np.ascontiguousarray(matrix * density)
    return Quadrature(np.expm1(stretch * u) / np.expm1(stretch), to_now[0].copy(), to_now)
