r"""The field history written plainly in PyTensor: the readable counterpart of the compiled kernel.

s is age since birth, t the age now, b = B/B_now, w = 1/b; at fixed total rate R today

.. math::

    -\dot b/b = A\,[\varphi(s) + q] + A\,\eta\,S(s)\,b, \qquad A = R/(1 + q + \eta S(t)), \quad \varphi(t) = 1

With J(s) the integral of the Ohmic rate from s to now, (w e^J)' = A eta S e^J, hence w = e^{-J} (1 - A eta E) with
E the integral of S e^J from s to now. The age solves G(t) = tau, where G is the integral of b^2 over the life.

The root is found numerically, inside a bracket; its derivatives are those of the implicit function theorem,
dy/dtheta = (e_tau - d ln G/d theta)/(d ln G/dy) with y = ln t and e_tau the unit vector of ln tau.
"""

import numpy as np
import pytensor
import pytensor.tensor as pt
from pytensor.compile.mode import Mode
from scipy.optimize import brentq

from decayinfer.inference.nodes import quadrature

LN_SIGMA = np.log(np.maximum(quadrature().sigma, 1e-300))
PLAIN = Mode(linker="py", optimizer="merge")  # nothing to compile: quick for so few calls


class ReferenceHistory:
    """The history of one cooling scenario; flags and freeze-out are inputs, so that one graph serves every channel."""

    def __init__(self, scenario):
        at, flags, freeze = pt.dvector("age and inputs"), pt.dvector("flags"), pt.dvector("freeze")
        ln_g, depth, ln_w, ln_phonon, ln_amplitude = self._terms(scenario, at[1:], flags, freeze, at[0])
        slope = pt.grad(ln_g, at)[0]
        ln_age_slope = at[1] + pt.log(slope) - at[0]  # dF/dt with F = G - tau and G = tau
        outputs = [at[0], depth, ln_w, ln_age_slope, ln_phonon, ln_amplitude]
        partial = [pt.grad(output, at, disconnected_inputs="ignore") for output in (*outputs, ln_g)]
        self._ln_g = pytensor.function([at, flags, freeze], ln_g, mode=PLAIN, on_unused_input="ignore")
        self._all = pytensor.function(
            [at, flags, freeze], [pt.stack(outputs), pt.stack(partial)], mode=PLAIN, on_unused_input="ignore"
        )

    def __call__(self, theta, flags, freeze):
        """Values (6,) and Jacobian (6, 7), as the kernel returns them."""

        def miss(ln_age):
            with np.errstate(all="ignore"):
                gap = float(self._ln_g(np.append(ln_age, theta), flags, freeze)) - theta[0]
            return gap if np.isfinite(gap) else 1e3  # beyond the wall of infinite birth field G is infinite

        root = brentq(miss, theta[0] - 30.0, theta[0] + 1e-9, xtol=1e-14, rtol=1e-14)
        values, partial = self._all(np.append(root, theta), flags, freeze)
        *rows, growth = partial
        age_slopes = (np.eye(7)[0] - growth[1:]) / growth[0]
        return values, np.array([row[1:] + row[0] * age_slopes for row in rows])

    @staticmethod
    def _terms(scenario, theta, flags, freeze, ln_age):
        """ln G, J(0), ln w(0), ln f now and ln A at an age."""
        _, ln_rate, ln_q, ln_eta, ln_attractor, mass, ln_umklapp = [theta[i] for i in range(7)]
        phonon, impurity, hall = flags[0], flags[1], flags[2]
        q = impurity * pt.exp(phonon * ln_q)  # the first process that acts is the reference
        eta = hall * pt.exp(pt.maximum(phonon, impurity) * ln_eta)
        _, weights, to_now = quadrature()

        def ln_f(ln_time):
            ln_temperature = scenario.ln_temperature(ln_time, mass)
            return 2.0 * ln_temperature - freeze[0] * pt.exp(freeze[1] * (ln_umklapp - ln_temperature))

        ln_phonon = ln_f(ln_age)
        switch_now = 1.0 / (1.0 + pt.exp(-4.0 * ln_attractor))
        ln_amplitude = ln_rate - pt.log(phonon + q + eta * switch_now)
        per_life = pt.exp(ln_age + ln_amplitude)

        history = phonon * pt.exp(ln_f(ln_age + LN_SIGMA) - ln_phonon) + q
        depth = per_life * pt.dot(to_now, history)
        switch = 1.0 / (1.0 + pt.exp(4.0 * (LN_SIGMA - ln_attractor)))
        drift = per_life * eta * pt.dot(to_now, switch * pt.exp(depth))
        ln_w = -depth + pt.log(1.0 - drift)
        ln_g = ln_age + pt.log(pt.dot(weights, pt.exp(-2.0 * ln_w)))
        return ln_g, depth[0], ln_w[0], ln_phonon, ln_amplitude
