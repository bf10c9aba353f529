"""Deposited structures and idealised geometries kept beside the checkout, where they are present."""

from __future__ import annotations

import json
from dataclasses import dataclass
from pathlib import Path

import pytest

from ehmo.errors import EhmoError
from ehmo.structure import assign_electrons, crystal_contents, perceive, read_frames

SHARED = Path(__file__).parents[3] / "shared"
CRYSTALS = sorted((SHARED / "crystals").glob("*.cif"))
MANIFEST = json.loads((SHARED / "crystals" / "manifest.json").read_text()) if CRYSTALS else []
MOLECULES = sorted((SHARED / "reference" / "xyz").glob("*.xyz"))


def _or_skip(paths: list[Path], what: str):
    skip = pytest.param(None, marks=pytest.mark.skip(reason=f"no {what} beside the checkout"))
    return [pytest.param(path, id=path.stem) for path in paths] or [skip]


@dataclass(frozen=True)
class Held:
    """Hand-checked content of a crystal: molecules and networks with copies in the cell and charge, other species."""

    molecules: tuple[tuple[str, int, int | None], ...] = ()
    networks: tuple[tuple[str, str, int, int | None], ...] = ()
    species: tuple[str, ...] = ()
    lacks: str = ""


CONTENT = {
    "AlMoP2O9_amcsd10997": Held(networks=(("framework", "AlMoO9P2", 1, 0),)),
    "H3PW12O40_6H2O_amcsd15958": Held((("O40PW12", 2, -3),), species=("H", "H2O")),
    "K2Cr2O7_amcsd10323": Held((("Cr2O7", 4, -2),), species=("K",)),
    "K2CrO4_amcsd09457": Held((("CrO4", 4, -2),), species=("K",)),
    "KCrClO3_amcsd10390": Held((("ClCrO3", 4, -1),), species=("K",)),
    "KNpO2PO4_3H2O_amcsd06146": Held(networks=(("layer", "NpO6P", 2, -2),), species=("H2O", "K"), lacks="water"),
    "KRuO4_amcsd16072": Held((("O4Ru", 4, -1),), species=("K",)),
    "MnO2_9009081": Held(networks=(("framework", "MnO2", 1, 0),)),
    "MoO3_Kihlborg_amcsd18982": Held(networks=(("layer", "MoO3", 2, 0),)),
    "Na2MoO4_2240655": Held((("MoO4", 8, -2),), species=("Na",)),
    # The ammine hydrogens are not in the file, so the balance cannot be drawn.
    "Pt_NH3_4_TcO4_2_amcsd10085": Held((("N4Pt", 1, None), ("O4Tc", 2, None)), lacks="ammine"),
    "RbMo2P2O10_1001614": Held(networks=(("framework", "MoO5P", 1, -4),), species=("H2O", "Rb"), lacks="water"),
    "ReO3_amcsd16967": Held(networks=(("framework", "O3Re", 1, 0),)),
    "SiW11_lacunary_Keggin_7006802": Held((("O39SiW11", 4, -8),), species=("C(NH2)3", "H2O", "K", "Na"), lacks="water"),
    "TcO_N2S2_amcsd11892": Held((("C10N2OS2Tc", 4, None),), species=("Cl",), lacks="amine"),
    "TiO2_rutile_9009083": Held(networks=(("framework", "O2Ti", 1, 0),)),
    "Ti_alkoxide_7050234": Held((("C29H68O16Ti4", 2, 0),)),
    "UO2_9009049": Held(networks=(("framework", "O2U", 1, 0),)),
    "V2O5_9012221": Held(networks=(("layer", "O5V2", 1, 0),)),
    "VOHPO4_2H2O_2007089": Held(networks=(("layer", "H3O6PV", 1, 0),), species=("H2O",)),
    "VO_Klaui_2219463": Held((("C36H70Co2O24P6V2", 4, 0),)),
    # Vanadium and tungsten share sites; the majority model of the second ion is V2W4O19.
    "VW5_Al13_polyoxo_1101169": Held(
        (("O19V2W4", 8, None), ("O19W6", 4, None)), species=("Al13O40", "H2O"), lacks="hydroxide"
    ),
    "anorthominasragrite_amcsd06681": Held((("H12O16S2V2", 1, 0),), species=("H2O",), lacks="water"),
    "studtite_amcsd03153": Held(networks=(("chain", "H4O6U", 2, 0),), species=("H2O",)),
}
"""Written down from the papers' titles and formulas and from the structures themselves."""

REFUSED = {"Ru3_dpa4_7105250": "Ru1, Ru2 disordered about a symmetry element"}


@pytest.mark.parametrize("path", _or_skip(CRYSTALS, "crystal structures"))
def test_crystals_hold_what_they_should(path):
    if path.stem in REFUSED:
        with pytest.raises(EhmoError, match=REFUSED[path.stem]) as caught:
            crystal_contents(path)
        assert caught.value.mend
        return
    contents, held = crystal_contents(path), CONTENT[path.stem]
    molecules = sorted((m.fragment.formula, m.multiplicity, m.fragment.charge) for m in contents.molecules)
    assert tuple(molecules) == held.molecules
    networks = ((n.word, n.reduced_formula, n.multiplicity, n.charge) for n in contents.networks)
    assert tuple(networks) == held.networks
    assert tuple(sorted({species.formula for species in contents.species})) == held.species
    said = " ".join(contents.missing_hydrogens)
    assert (held.lacks in said) if held.lacks else not said


@pytest.mark.parametrize("entry", MANIFEST or [None], ids=lambda entry: entry["file"][:-4] if entry else "none")
def test_short_metal_oxygen_contacts_are_those_of_the_manifest(entry):
    """Distances as read when the collection was made, by another program, to 0.002 A."""
    if entry is None:
        pytest.skip("no crystal structures beside the checkout")
    path = SHARED / "crystals" / entry["file"]
    if path.stem in REFUSED:
        pytest.skip(f"not read: {REFUSED[path.stem]}")
    contents = crystal_contents(path)
    units = [unit for piece in (*contents.molecules, *contents.networks) for unit in piece.units]
    labels = set(contents.labels)
    for metal, donor, length in entry["short_contacts"]:
        if metal not in labels:
            continue  # the minor element of a mixed site
        found = [unit.length_A for unit in units if (unit.metal, unit.donor) == (metal, donor)]
        assert min(abs(d - length) for d in found) < 0.002
    if entry["formula"] and not entry["disorder_tags"]:
        elements = {symbol for symbol in contents.symbols if symbol != "H"}
        assert elements <= {word.rstrip("0123456789.") for word in entry["formula"].split()}


@pytest.mark.parametrize("path", _or_skip(CRYSTALS, "crystal structures"))
def test_multiplicities_of_crystals_add_up(path):
    """Units of each metal, by its copies in the cell, are the bonds that the molecule or network has."""
    if path.stem in REFUSED:
        pytest.skip(f"not read: {REFUSED[path.stem]}")
    contents = crystal_contents(path)
    for molecule in contents.molecules:
        bonds = [bond for bond in perceive(molecule.fragment).bonds if molecule.fragment.symbols[bond.donor] != "H"]
        assert sum(unit.multiplicity for unit in molecule.units) == len(bonds) * molecule.multiplicity
        origin = molecule.fragment.crystal
        orbits = {
            origin.labels[b.metal] + origin.labels[b.donor]: origin.bond_multiplicity(b.metal, b.donor) for b in bonds
        }
        by_label: dict[str, int] = {}
        for unit in molecule.units:
            by_label[unit.metal + unit.donor] = by_label.get(unit.metal + unit.donor, 0) + unit.multiplicity
        assert all(orbits[key] <= by_label[key] for key in orbits)


def test_peroxide_is_no_oxo_and_disorder_makes_no_nitrido():
    path = SHARED / "crystals" / "studtite_amcsd03153.cif"
    if not path.exists():
        pytest.skip("no crystal structures beside the checkout")
    (chain,) = crystal_contents(path).networks
    kinds = {unit.donor: unit.kind.value for unit in chain.units}
    assert kinds == {"O1": "oxo", "O2": "peroxo (side-on)", "O3": "aqua"}


def test_placing_ammine_hydrogens_completes_the_platinum_salt():
    path = SHARED / "crystals" / "Pt_NH3_4_TcO4_2_amcsd10085.cif"
    if not path.exists():
        pytest.skip("no crystal structures beside the checkout")
    contents = crystal_contents(path, hydrogens="place")
    charges = {m.fragment.formula: m.fragment.charge for m in contents.molecules}
    assert charges == {"H12N4Pt": 2, "O4Tc": None}
    assert not contents.missing_hydrogens


@pytest.mark.parametrize("path", _or_skip(MOLECULES, "reference geometries"))
def test_reference_molecules_state_charge_and_spin(path):
    (fragment,) = read_frames(path)
    assignment = assign_electrons(fragment, perceive(fragment))
    assert assignment.charge == fragment.charge
    assert assignment.unpaired_electrons == fragment.unpaired_electrons
    assert assignment.charge_reason == "given in the file"
