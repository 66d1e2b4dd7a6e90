r"""The second frequency derivative during the recovery from a glitch.

Between glitches the step in nudot heals: linearly until the next glitch, an interval T later, and exponentially with
a time tau_d,

.. math::

    \ddot\nu = |\Delta\dot\nu| [(1 - q)/T + (q/\tau_d) e^{-\Delta t/\tau_d}],

q the share of the step in the exponential. The second term is (dnu_d/tau_d^2) e^{-dt/tau_d} of the usual glitch phase
with dnu_d = q |step| tau_d; the first gives n_ig = nu |step|/(nudot^2 T), the relation that Lower et al. 2021
(arXiv:2109.07612) find near one to one.
"""

from decayinfer.physics.namespace import Value, namespace

__all__ = ["recovery_excess"]


def recovery_excess(
    step: Value, *, timescale: Value, interval: Value, elapsed: Value, share: Value, decay_time: Value
) -> Value:
    """Return what the recovery adds to the braking index; never negative.

    Parameters
    ----------
    step : float or array
        |Delta nudot/nudot| of the glitch.
    timescale : float or array
        nu/|nudot| = P/Pdot, in the unit of the times below.
    interval, elapsed : float or array
        Time from this glitch to the next, and since this glitch.
    share, decay_time : float or array
        Share q of the step that recovers exponentially, and its time.
    """
    xp = namespace(step, interval, elapsed)
    rate = (1.0 - share) / interval + share / decay_time * xp.exp(-elapsed / decay_time)
    return step * timescale * rate
