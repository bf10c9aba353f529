"""The rest of a molecule relaxed while one length or angle is held."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from basis_params import ParameterTable
from ehmo.analysis.symmetry.fitting import superposition
from ehmo.errors import ConvergenceError, InputError
from ehmo.records.arrays import FloatArray
from ehmo.records.fragment import Fragment
from ehmo.records.options import Options
from ehmo.records.scan import ScanPlan
from ehmo.structure.graph import bond_graph

LARGEST_FORCE_EV_PER_A = 0.01
"""A geometry is relaxed when no atom feels more, the held coordinate apart [eV/angstrom]."""

MOST_STEPS = 300


def bonded_pairs(fragment: Fragment) -> tuple[tuple[int, int], ...]:
    """Bonded atoms of a fragment, each pair once."""
    graph = bond_graph(fragment)
    pairs = {
        (min(atom, other), max(atom, other))
        for atom in range(len(fragment))
        for other in (*graph.neighbours[atom], *graph.metal_neighbours[atom])
    }
    return tuple(sorted(pairs | set(graph.metal_contacts)))


def check_relaxable(fragment: Fragment, table: ParameterTable) -> None:
    """Refuse to relax with a set that lacks a two-body term of bonded atoms.

    Raises
    ------
    InputError
        It names the pairs.
    """
    symbols = fragment.symbols
    missing = sorted(
        {
            f"{symbols[a]}-{symbols[b]}"
            for a, b in bonded_pairs(fragment)
            if table.pair_repulsion(symbols[a], symbols[b]) is None
        }
    )
    if missing:
        raise InputError(
            f"the set {table.name} has no two-body terms of the bonds {', '.join(missing)}: what it relaxes to means "
            "nothing",
            mend="leave out --relax, or take a set that is calibrated for them",
        )


def relaxed(fragment: Fragment, plan: ScanPlan, value: float, table: ParameterTable, options: Options) -> Fragment:
    """Geometry of lowest energy with the scanned coordinate held, laid over the start.

    Parameters
    ----------
    fragment : Fragment
        With the coordinate at its value.
    plan : ScanPlan
    value : float
        Length [angstrom] or angle [degree].
    table : ParameterTable
    options : Options

    Returns
    -------
    fragment : Fragment

    Raises
    ------
    ConvergenceError
        If it does not settle.
    EhmoError
        See `fragment_energy`.
    """
    from ase import Atoms
    from ase.constraints import FixInternals
    from ase.optimize import BFGS

    from ehmo.studies.ase_calculator import Calculator

    assert fragment.charge is not None
    atoms = Atoms(fragment.symbols, fragment.positions_A)
    atoms.calc = Calculator(
        table, charge=fragment.charge, unpaired_electrons=fragment.unpaired_electrons, options=options
    )
    held = [[value, list(plan.atoms)]]
    constraint = {"bonds": held} if plan.coordinate == "length" else {"angles_deg": held}
    atoms.set_constraint(FixInternals(**constraint))  # type: ignore[no-untyped-call]
    try:
        with BFGS(atoms, logfile=None) as optimiser:
            settled = optimiser.run(fmax=LARGEST_FORCE_EV_PER_A, steps=MOST_STEPS)
    except (ValueError, ZeroDivisionError, np.linalg.LinAlgError) as fault:
        raise ConvergenceError(f"the relaxation failed ({fault})", mend="start nearer to a minimum") from None
    if not settled:
        raise ConvergenceError(f"not relaxed after {MOST_STEPS} steps", mend="start nearer to a minimum")
    return replace(fragment, positions_A=laid_over(atoms.positions, fragment.positions_A))


def laid_over(positions: FloatArray, target: FloatArray) -> FloatArray:
    """Positions turned and shifted onto a target by least squares, so that local axes of the start still serve."""
    centre, wanted = positions.mean(axis=0), target.mean(axis=0)
    turn = superposition(positions - centre, target - wanted)
    result: FloatArray = (positions - centre) @ turn.T + wanted
    return result


def left_range(fragment: Fragment, table: ParameterTable) -> tuple[str, ...]:
    """Bonds of a relaxed geometry beyond the lengths that their terms are calibrated for, one sentence each."""
    said = []
    for a, b in bonded_pairs(fragment):
        length = float(np.linalg.norm(fragment.positions_A[a] - fragment.positions_A[b]))
        term = table.pair_repulsion(fragment.symbols[a], fragment.symbols[b])
        if term is not None and not term.covers(length):
            said.append(
                f"{fragment.labels[a]}-{fragment.labels[b]} relaxed to {length:.3f} Å, outside the range of its "
                f"two-body term, {term.lowest_A:g} to {term.highest_A:g} Å"
            )
    return tuple(said)
