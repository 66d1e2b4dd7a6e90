"""Every public formula gives PyTensor variables what it gives NumPy arrays."""

import subprocess
import sys
from inspect import isfunction

import numpy as np
import pytensor
import pytensor.tensor as pt
import pytest

from decayinfer.physics import conduction, hall, history, lattice, namespace, structure, timing, torque

MODULES = (conduction, hall, history, lattice, structure, timing, torque)
ROWS = 4
AGES = np.array([1e2, 1e4, 3e5, 2e6])
FIELDS = np.array([0.3, 1.7, 11.0, 240.0])
MASSES = np.array([0.9, 1.2, 1.5, 2.0])
RADII = np.array([12.1, 11.9, 11.5, 10.7])
TIMES = np.array([3e3, 1e5, 2e6, 4e7])
PERIODS = np.array([0.033, 0.2, 0.9, 7.0])
SLOWDOWNS = np.array([4e-13, 1e-14, 1e-15, 1e-12])
ANGLES = np.array([0.1, 0.6, 1.0, 1.5])
DENSITIES = np.array([0.02, 0.1, 0.5, 1.3])
TEMPERATURES = np.array([0.05, 0.6, 1.3, 4.0])
NUMBERS = np.array([1.5, 3.1, 12.0, 77.0])
GRAVITIES = np.array([1.1, 1.5, 2.0, 3.0])
FRACTIONS = np.array([0.03, 0.05, 0.08, 0.2])
CHARGES = np.array([20.0, 30.0, 40.0, 50.0])

CRUST = {"gravity_14": GRAVITIES, "electron_fraction": FRACTIONS}
CASES = {
    "conductivity_phonon": ((DENSITIES, TEMPERATURES), {"electron_fraction": FRACTIONS}),
    "conductivity_impurity": ((DENSITIES, NUMBERS), {"electron_fraction": FRACTIONS, "charge": CHARGES}),
    "ohmic_time": ((1e24 * NUMBERS, FRACTIONS), {}),
    "phonon_time": ((DENSITIES, TEMPERATURES), CRUST),
    "density_from_phonon_time": ((TIMES, GRAVITIES), {}),
    "impurity_time": ((DENSITIES, NUMBERS), {**CRUST, "charge": CHARGES}),
    "impurity_parameter": ((FRACTIONS, CHARGES), {}),
    "drift_time": ((1e35 * NUMBERS, FRACTIONS, FIELDS), {}),
    "hall_time": ((DENSITIES, FIELDS), CRUST),
    "attractor_switch": ((AGES, TIMES[::-1].copy()), {}),
    "switch_time": ((FIELDS,), {}),
    "exponential_field": ((AGES, FIELDS), {"decay_time": TIMES}),
    "hall_field": ((AGES, FIELDS), {"hall_time": TIMES}),
    "lumped_field": ((AGES, FIELDS), {"ohmic_time": 1e6 * TEMPERATURES, "hall_time": TIMES}),
    "lumped_rate": ((FIELDS, 2 * FIELDS), {"ohmic_time": 1e6 * TEMPERATURES, "hall_time": TIMES}),
    "plasma_temperature": ((DENSITIES, FRACTIONS), {}),
    "debye_temperature": ((DENSITIES, FRACTIONS), {}),
    "umklapp_temperature": ((DENSITIES, FRACTIONS, CHARGES), {}),
    "freeze_out": ((TEMPERATURES, TEMPERATURES[::-1].copy()), {"strength": FRACTIONS, "power": GRAVITIES}),
    "compactness": ((MASSES, RADII), {}),
    "redshift_factor": ((MASSES, RADII), {}),
    "surface_gravity_14": ((MASSES, RADII), {}),
    "moment_of_inertia_45": ((MASSES, RADII), {}),
    "moment_of_inertia_ls_45": ((MASSES, RADII), {}),
    "nuddot_error": ((NUMBERS, FRACTIONS), {"count": 10 * CHARGES, "span": PERIODS}),
    "index_error": ((NUMBERS, -1e2 * SLOWDOWNS, 1e-12 * SLOWDOWNS), {}),
    "baseline": (
        (NUMBERS, -1e2 * SLOWDOWNS),
        {"index_error": FIELDS, "residual": FRACTIONS, "cadence": PERIODS},
    ),
    "span_exponent": ((np.array([0.0, 3.9, 6.0, 9.0]),), {}),
    "characteristic_age": ((PERIODS, SLOWDOWNS), {}),
    "spin_down_constant": ((), {"radius_km": RADII, "inertia_45": MASSES, "torque": FRACTIONS}),
    "dipole_field": ((PERIODS, SLOWDOWNS), {"radius_km": RADII, "inertia_45": MASSES}),
    "spin_down_luminosity": ((PERIODS, SLOWDOWNS), {"inertia_45": MASSES}),
    "decay_rate": ((NUMBERS, AGES), {}),
    "decay_time": ((NUMBERS, AGES), {}),
    "braking_index": ((1e-5 * FRACTIONS, AGES), {}),
    "index_from_frequency": ((1 / PERIODS, -SLOWDOWNS, 1e-9 * SLOWDOWNS), {}),
    "third_derivative": ((NUMBERS, 1 / PERIODS, -1e3 * SLOWDOWNS), {}),
    "torque_factor": ((ANGLES,), {}),
    "obliquity_index": ((ANGLES,), {}),
    "obliquity_invariant": ((NUMBERS, ANGLES), {}),
}
FORMULAS = {
    name: getattr(module, name)
    for module in MODULES
    for name in module.__all__
    if isfunction(getattr(module, name))
}


def test_every_public_formula_has_a_case():
    assert set(FORMULAS) == set(CASES)


def evaluate(function, args, kwargs, variable):
    """Call with PyTensor inputs of the given kind and evaluate in the fast-compile mode."""
    arrays = [*args, *kwargs.values()]
    inputs = [variable(f"x{i}") for i in range(len(arrays))]
    output = function(*inputs[: len(args)], **dict(zip(kwargs, inputs[len(args) :], strict=True)))
    assert output.dtype == "float64"
    return pytensor.function(inputs, output, mode="FAST_COMPILE"), arrays


@pytest.mark.parametrize("name", sorted(CASES))
def test_pytensor_value_equals_numpy_value(name):
    args, kwargs = CASES[name]
    expected = FORMULAS[name](*args, **kwargs)
    assert expected.dtype == np.float64
    compiled, arrays = evaluate(FORMULAS[name], args, kwargs, pt.dvector)
    np.testing.assert_allclose(compiled(*arrays), expected, rtol=1e-14)


@pytest.mark.parametrize("name", sorted(set(CASES) - {"impurity_parameter"}))
def test_plain_floats_give_the_entries_of_the_array(name):
    args, kwargs = CASES[name]
    expected = FORMULAS[name](*args, **kwargs)
    for row in range(ROWS):
        single = FORMULAS[name](
            *(float(a[row]) for a in args), **{k: float(v[row]) for k, v in kwargs.items()}
        )
        np.testing.assert_allclose(single, expected[row], rtol=1e-14)


def test_a_bare_literal_in_pytensor_loses_digits():
    """The trap that formulas avoid: constants come from NumPy, never from PyTensor applied to a literal."""
    assert abs(float(pt.log(10.0).eval()) - np.log(10.0)) > 1e-9


def test_namespace_looks_at_all_arguments():
    assert namespace.namespace(1.0, np.ones(2)) is np
    assert namespace.namespace(1.0, pt.dscalar("x")) is pt
    assert namespace.namespace(pytensor.shared(1.0), 2.0) is pt


def test_formulas_do_not_import_pytensor():
    code = (
        "import sys\n"
        "from decayinfer.physics import conduction, hall, history, lattice, structure, timing, torque\n"
        "torque.dipole_field(0.1, 1e-14)\n"
        "sys.exit('pytensor' in sys.modules or 'astropy' in sys.modules)"
    )
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
