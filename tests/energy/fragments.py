"""Fragments and test-only two-body terms for the tests of energies."""

from dataclasses import replace

import numpy as np

import basis_params
from basis_params.model import PairRepulsion
from ehmo import Options
from ehmo.calculate import effective_settings
from ehmo.calculate.energy import fragment_energy
from tests.geometries import SPECIES

STANDARD = basis_params.load_set("standard")

FIXED = Options(charge_model="fixed")
CHANNELS = Options(K_sigma=1.67, K_pi=2.0, K_delta=1.5, K_decay_per_A=0.3)
UNWEIGHTED = Options(K_sigma=1.67, K_pi=2.0, K_decay_per_A=0.3, weighting=False)


def with_terms(*terms: tuple[str, str, float, float, float, float]):
    """Standard set with invented two-body terms: for the tests only, no chemistry in them."""
    pairs = [PairRepulsion(*term, "invented", "for a test only", "derived") for term in terms]
    return replace(STANDARD, name="invented", repulsion={pair.label: pair for pair in pairs})


def moved(name: str, seed: int = 1, size: float = 0.03):
    """Species of the tests with every atom moved at random, so that no symmetry hides a fault."""
    fragment = SPECIES[name].fragment()
    shift = size * np.random.default_rng(seed).normal(size=(len(fragment), 3))
    return replace(fragment, positions_A=fragment.positions_A + shift)


def energy(fragment, options=None, table=STANDARD, **more):
    options = options or Options()
    return fragment_energy(fragment, table, effective_settings(table.settings, options), options, **more)
