"""Energies, gradients, calculators."""
