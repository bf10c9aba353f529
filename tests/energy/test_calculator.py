"""The calculator in ASE's own optimisers, vibrations and constraints."""

import numpy as np
import pytest
from ase import Atoms
from ase.constraints import FixBondLengths
from ase.optimize import BFGS
from ase.vibrations import Vibrations

import ehmo
from ehmo import Options
from ehmo.errors import EhmoError, InputError
from ehmo.studies.stretching import bond_force_constants, normal_modes
from ehmo.units import PER_CM_PER_ROOT_EV_A2_U
from tests.energy.fragments import energy, with_terms
from tests.geometries import SPECIES

# Invented terms, for these tests only.
TABLE = with_terms(("O", "H", 300.0, 4.5, 0.8, 1.2), ("H", "H", 20.0, 3.0, 0.8, 2.0), ("V", "O", 2500.0, 4.2, 1.4, 2.2))
OXIDE = with_terms(("V", "O", 2500.0, 4.2, 1.4, 2.2))


def water():
    return Atoms("OH2", [[0, 0, 0], [0.80, 0.55, 0], [-0.72, 0.62, 0]])


def vanadium_monoxide():
    return Atoms("VO", [[0, 0, 0], [0, 0, 1.6]])


def test_results_are_those_of_the_energy():
    fragment = SPECIES["VOCl3"].fragment()
    atoms = Atoms(fragment.symbols, fragment.positions_A)
    atoms.calc = ehmo.Calculator(TABLE)
    found = energy(fragment, table=TABLE, gradient=True)
    assert atoms.get_potential_energy() == pytest.approx(found.total_eV)
    assert atoms.get_potential_energy(force_consistent=True) == pytest.approx(found.free_eV)
    np.testing.assert_allclose(atoms.get_forces(), -found.gradient_eV_per_A)
    np.testing.assert_allclose(atoms.get_charges(), found.charges)


def test_optimiser_finds_a_minimum_and_vibrations_are_real(tmp_path):
    atoms = water()
    atoms.calc = ehmo.Calculator(TABLE)
    assert BFGS(atoms, logfile=None).run(fmax=1e-4, steps=100)
    lengths = atoms.get_distances(0, [1, 2])
    assert lengths[0] == pytest.approx(lengths[1], abs=1e-4)  # law: symmetry of the minimum
    vibrations = Vibrations(atoms, name=str(tmp_path / "vib"))
    vibrations.run()
    found = vibrations.get_frequencies()
    assert np.abs(found[:6]).max() < 60  # law: translations and rotations
    assert (found[6:].real > 500).all()
    assert np.abs(found[6:].imag).max() == 0


def test_vibration_of_a_diatomic_is_that_of_its_force_constant(tmp_path):
    """Law: omega^2 = k (1/m1 + 1/m2), with k from second differences of the energy."""
    atoms = vanadium_monoxide()
    atoms.calc = ehmo.Calculator(OXIDE, unpaired_electrons=1)
    assert BFGS(atoms, logfile=None).run(fmax=1e-5, steps=100)
    length, step = atoms.get_distance(0, 1), 0.004

    def at(r):
        copy = Atoms("VO", [[0, 0, 0], [0, 0, r]], calculator=atoms.calc)
        return copy.get_potential_energy()

    k = (at(length + step) - 2 * at(length) + at(length - step)) / step**2
    expected = np.sqrt(k * (1 / 50.9415 + 1 / 15.999)) * PER_CM_PER_ROOT_EV_A2_U
    vibrations = Vibrations(atoms, name=str(tmp_path / "vib"), delta=0.005)
    vibrations.run()
    assert vibrations.get_frequencies()[-1].real == pytest.approx(expected, rel=2e-3)
    assert normal_modes(np.array([[k]]), np.array([[1 / 50.9415 + 1 / 15.999]])).wavenumbers_per_cm[0] == pytest.approx(
        expected
    )


def test_constraints_hold():
    atoms = water()
    atoms.set_constraint(FixBondLengths([[0, 1]]))
    before = atoms.get_distance(0, 1)
    atoms.calc = ehmo.Calculator(TABLE)
    BFGS(atoms, logfile=None).run(fmax=1e-3, steps=100)
    assert atoms.get_distance(0, 1) == pytest.approx(before, abs=1e-6)


@pytest.mark.parametrize("name", ["VOCl3", "[VO(OH2)5]2+"])
def test_dipole_lies_along_the_axis_and_moves_with_the_charge(name):
    fragment = SPECIES[name].fragment()
    atoms = Atoms(fragment.symbols, fragment.positions_A)
    atoms.calc = ehmo.Calculator(
        charge=fragment.charge, unpaired_electrons=fragment.unpaired_electrons, options=Options(charge_model="fixed")
    )
    dipole = atoms.get_dipole_moment()
    # Law: C3v and C4v.
    assert np.abs(dipole[:2]).max() < 1e-6
    shifted = atoms.copy()
    shifted.positions += [1.0, -2.0, 0.5]
    shifted.calc = atoms.calc
    # Law: the moment of an ion moves with its charge.
    np.testing.assert_allclose(
        shifted.get_dipole_moment() - dipole, fragment.charge * np.array([1, -2, 0.5]), atol=1e-8
    )


def test_dipole_of_a_symmetric_molecule_vanishes():
    fragment = SPECIES["TiCl4"].fragment()
    atoms = Atoms(fragment.symbols, fragment.positions_A)
    atoms.calc = ehmo.Calculator()
    assert np.abs(atoms.get_dipole_moment()).max() < 1e-6  # law


def test_unpaired_electrons_follow_the_parity_unless_given():
    atoms = Atoms("VO", [[0, 0, 0], [0, 0, 1.6]])
    atoms.calc = ehmo.Calculator(OXIDE)
    low = atoms.get_potential_energy()
    atoms.calc = ehmo.Calculator(OXIDE, unpaired_electrons=1)
    assert atoms.get_potential_energy() == pytest.approx(low)
    atoms.calc = ehmo.Calculator(OXIDE, unpaired_electrons=2)
    with pytest.raises(EhmoError, match="unpaired"):
        atoms.get_potential_energy()


def test_periodic_atoms_are_refused():
    atoms = Atoms("VO", [[0, 0, 0], [0, 0, 1.6]], cell=[5, 5, 5], pbc=(True, False, False))
    atoms.calc = ehmo.Calculator()
    with pytest.raises(InputError, match="periodic"):
        atoms.get_potential_energy()


def test_curvature_along_a_bond_is_that_of_the_energy():
    from ehmo.calculate.energy import energy_model
    from ehmo.structure import perceive
    from ehmo.studies.displacement import stretched

    fragment = SPECIES["CrO2Cl2"].fragment()
    table = with_terms(("Cr", "O", 2500.0, 4.2, 1.4, 2.2))
    coordination, model = perceive(fragment), energy_model(table)
    bonds = [bond for bond in coordination.bonds if bond.may_be_multiple]
    found = bond_force_constants(fragment, coordination, bonds, model)
    h = 0.004

    def at(*changes):
        return energy(stretched(fragment, coordination, bonds, np.array(changes)), table=table).free_eV

    # Law: second differences of the energy.
    assert found[0, 0] == pytest.approx((at(h, 0) - 2 * at(0, 0) + at(-h, 0)) / h**2, rel=2e-3)
    mixed = (at(h, h) - at(h, -h) - at(-h, h) + at(-h, -h)) / (4 * h * h)
    assert found[0, 1] == pytest.approx(mixed, abs=0.02)
