"""Compactness, gravity and moment of inertia."""

import numpy as np
import pytest

from decayinfer.physics.structure import (
    compactness,
    moment_of_inertia_45,
    moment_of_inertia_ls_45,
    redshift_factor,
    surface_gravity_14,
)


@pytest.mark.parametrize(
    ("radius", "compact", "gravity", "redshift"),
    [(12.0, 0.34455, 1.5937, 1.2352), (10.0, 0.41346, 2.4260, 1.3057)],
)
def test_general_relativistic_factors(radius, compact, gravity, redshift):
    """Definitions, worked for 1.4 M_sun."""
    assert compactness(1.4, radius) == pytest.approx(compact, rel=2e-5)
    assert surface_gravity_14(1.4, radius) == pytest.approx(gravity, rel=3e-5)
    assert 1.0 / redshift_factor(1.4, radius) == pytest.approx(redshift, rel=4e-5)


STARS = np.array(
    [
        (1.2, 11.79, 1.113), (1.4, 11.70, 1.366), (1.6, 11.54, 1.618), (1.8, 11.26, 1.852),
        (2.0, 10.62, 1.998), (1.2, 12.54, 1.269), (1.4, 12.59, 1.581), (1.6, 12.58, 1.904),
        (1.8, 12.50, 2.229), (2.0, 12.30, 2.534),
    ]
)  # fmt: skip


def test_inertia_of_integrated_stars():
    """Mass, radius, inertia of our own slow-rotation integrations, SLy4 then BSk24.

    Bejger & Haensel 2002 stays within -5 to +2 %; Lattimer & Schutz 2005 (from memory) within 3 %.
    """
    mass, radius, inertia = STARS.T
    ratio = moment_of_inertia_45(mass, radius) / inertia
    assert np.all((ratio > 0.95) & (ratio < 1.02))
    np.testing.assert_allclose(moment_of_inertia_ls_45(mass, radius), inertia, rtol=0.03)


def test_inertia_of_lattimer_and_schutz():
    assert moment_of_inertia_ls_45(1.4, 10.0) == pytest.approx(1.0705, rel=1e-4)


def test_inertia_is_continuous_where_its_branches_meet():
    """At M/R = 0.1 M_sun/km both forms of Bejger & Haensel 2002 give a = 1/3."""
    below, above = moment_of_inertia_45(np.array([1.2 - 1e-9, 1.2 + 1e-9]), 12.0)
    assert below == pytest.approx(above, rel=1e-7)
    assert moment_of_inertia_45(0.6, 12.0) == pytest.approx(
        0.05 / 0.2 * 0.6 * 1.98841e33 * 1.44e12 / 1e45, rel=1e-5
    )
