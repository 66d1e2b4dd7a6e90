"""Closed formulas of neutron-star crusts and pulsar spin-down, each written once for NumPy and PyTensor.

Units are the internal ones unless a name says otherwise: yr, s, 1e12 G, M_sun, km, 1e8 K; densities in
1e14 g cm^-3, gravity in 1e14 cm s^-2, moments of inertia in 1e45 g cm^2, rates in 1/yr, angles in radians.
"""
