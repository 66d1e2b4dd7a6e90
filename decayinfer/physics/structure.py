"""Compactness, gravity, redshift and moment of inertia from mass [M_sun] and radius [km]."""

from decayinfer.physics.constants import C_CGS, G_CGS, INERTIA_UNIT_CGS, KM_CM, M_SUN_G
from decayinfer.physics.namespace import Value, namespace

__all__ = [
    "compactness",
    "moment_of_inertia_45",
    "moment_of_inertia_ls_45",
    "redshift_factor",
    "surface_gravity_14",
]


def compactness(mass: Value, radius_km: Value) -> Value:
    """Return x = 2 G M/(R c^2)."""
    return 2.0 * G_CGS * M_SUN_G / (KM_CM * C_CGS**2) * mass / radius_km


def redshift_factor(mass: Value, radius_km: Value) -> Value:
    """Return (1 - x)^(1/2), the rate of a clock at the surface against a distant one."""
    return namespace(mass, radius_km).sqrt(1.0 - compactness(mass, radius_km))


def surface_gravity_14(mass: Value, radius_km: Value) -> Value:
    """Return G M/(R^2 (1 - x)^(1/2)) [1e14 cm s^-2]."""
    newtonian = G_CGS * M_SUN_G / KM_CM**2 / 1e14 * mass / radius_km**2
    return newtonian / redshift_factor(mass, radius_km)


def moment_of_inertia_45(mass: Value, radius_km: Value) -> Value:
    """Return the moment of inertia [1e45 g cm^2] of a neutron star (Bejger & Haensel 2002, A&A 396, 917).

    I = a(y) M R^2 with y = (M/M_sun)(km/R): a = y/(0.1 + 2 y) up to y = 0.1, (2/9)(1 + 5 y) above; for M
    above 0.2 M_sun.
    """
    y = mass / radius_km
    light, heavy = y / (0.1 + 2.0 * y), 2.0 / 9.0 * (1.0 + 5.0 * y)
    return namespace(mass, radius_km).where(y <= 0.1, light, heavy) * _mr2_45(mass, radius_km)


def moment_of_inertia_ls_45(mass: Value, radius_km: Value) -> Value:
    """Return the moment of inertia [1e45 g cm^2] of Lattimer & Schutz 2005, ApJ 629, 979, from memory.

    I = 0.237 M R^2 (1 + 4.2 y + 90 y^4) with y = (M/M_sun)(km/R); for M above about 1 M_sun.
    """
    y = mass / radius_km
    return 0.237 * (1.0 + 4.2 * y + 90.0 * y**4) * _mr2_45(mass, radius_km)


def _mr2_45(mass: Value, radius_km: Value) -> Value:
    return M_SUN_G * KM_CM**2 / INERTIA_UNIT_CGS * mass * radius_km**2
