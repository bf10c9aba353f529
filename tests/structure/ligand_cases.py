"""Idealised molecules for donor kinds and ligand charges beyond the species every calculation must handle.

Lengths and angles are typical values (common practice); what is checked is the name of the donor, not the numbers.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from ehmo.records.coordination import DonorKind
from ehmo.records.fragment import Fragment
from tests.molecule_builder import TETRAHEDRAL_DEG, Molecule

AZIMUTHS_3 = (0.0, 120.0, 240.0)
Case = tuple[Fragment, DonorKind, int | None]


def _fragment(molecule: Molecule) -> Fragment:
    return Fragment(tuple(molecule.symbols), np.array(molecule.points))


def _on_chloride(metal: str, length: float, add: Callable[[Molecule], object]) -> Fragment:
    """MCl3 with the ligand of interest on z."""
    molecule = Molecule(metal)
    for phi in AZIMUTHS_3:
        molecule.donor("Cl", length, TETRAHEDRAL_DEG, phi)
    add(molecule)
    return _fragment(molecule)


def _chain(*links: tuple[str, float, float, float]) -> Callable[[Molecule], object]:
    """A donor on z, then atoms one after another: symbol, length, angle, dihedral."""

    def add(molecule: Molecule) -> None:
        last = molecule.donor(links[0][0], links[0][1], 0.0)
        for symbol, length, angle, dihedral in links[1:]:
            last = molecule.grow(symbol, last, length, angle, dihedral)

    return add


def _hydroxo(m: Molecule) -> None:
    m.grow("H", m.donor("O", 1.82, 0.0), 0.96, 125.0)


def _acetato(m: Molecule) -> None:
    oxygen = m.donor("O", 1.95, 0.0)
    carbon = m.grow("C", oxygen, 1.29, 130.0, 60.0)
    m.grow("O", carbon, 1.23, 122.0, 180.0)
    m.methyl(carbon, 1.50, 116.0, 0.0)


def _chelating_nitrato(m: Molecule) -> None:
    first = m.put("O", np.array([1.08, 0.0, 1.90]))
    m.put("O", np.array([-1.08, 0.0, 1.90]))
    nitrogen = m.put("N", np.array([0.0, 0.0, 2.55]), first)
    m.put("O", np.array([0.0, 0.0, 3.77]), nitrogen)


def _sulfato(m: Molecule) -> None:
    sulfur = m.grow("S", m.donor("O", 1.95, 0.0), 1.52, 135.0, 60.0)
    for dihedral in AZIMUTHS_3:
        m.grow("O", sulfur, 1.45, TETRAHEDRAL_DEG, dihedral)


def _side_on(symbol: str, half: float, height: float) -> Callable[[Molecule], object]:
    def add(m: Molecule) -> None:
        for x in (half, -half):
            m.put(symbol, np.array([x, 0.0, height]))

    return add


def _ethylene(m: Molecule) -> None:
    for x in (0.69, -0.69):
        carbon = m.put("C", np.array([x, 0.0, 2.05]))
        for y in (0.92, -0.92):
            m.put("H", np.array([x * 1.75, y, 2.25]), carbon)


def _acetylacetonato(m: Molecule) -> None:
    for side in (1.0, -1.0):
        oxygen = m.put("O", np.array([1.40 * side, 0.0, 1.35]))
        carbon = m.put("C", np.array([1.25 * side, 0.0, 2.62]), oxygen)
        methyl = m.put("C", np.array([2.52 * side, 0.0, 3.42]), carbon)
        m.hydrogens(methyl, 3)
    m.put("H", np.array([0.0, 0.0, 4.35]), m.put("C", np.array([0.0, 0.0, 3.27])))


def _ether(m: Molecule) -> None:
    oxygen = m.donor("O", 2.05, 0.0)
    for dihedral in (0.0, 180.0):
        m.methyl(oxygen, 1.43, 122.0, dihedral)


def _acetonitrile(m: Molecule) -> None:
    nitrogen = m.donor("N", 2.10, 0.0)
    m.methyl(m.grow("C", nitrogen, 1.14, 178.0), 1.46, 179.0)


def _pyridine(m: Molecule) -> None:
    nitrogen = m.donor("N", 2.10, 0.0)
    ring = [nitrogen]
    for k in range(1, 6):
        turn = np.radians(60.0 * k)
        position = np.array([1.38 * np.sin(turn), 0.0, 3.48 - 1.38 * np.cos(turn)])
        ring.append(m.put("C", position, nitrogen))
        m.put("H", position + 1.08 * (position - np.array([0.0, 0.0, 3.48])) / 1.38, ring[-1])
    # N-C of pyridine is 1.34, shorter than C-C.
    for k in (1, 5):
        m.points[ring[k]] = m.points[nitrogen] + 0.972 * (m.points[ring[k]] - m.points[nitrogen])


def _phosphine(m: Molecule) -> None:
    phosphorus = m.donor("P", 2.45, 0.0)
    for dihedral in AZIMUTHS_3:
        m.methyl(phosphorus, 1.83, 115.0, dihedral)


def _thiolato(m: Molecule) -> None:
    m.methyl(m.donor("S", 2.28, 0.0), 1.82, 106.0, 60.0)


def _methyl(m: Molecule) -> None:
    m.hydrogens(m.donor("C", 2.07, 0.0), 3)


def _phenyl(m: Molecule) -> None:
    m.symbols.append("X")
    m.points.append(np.array([0.0, 0.0, 0.05]))
    m.parents.append(0)
    dummy = len(m.symbols) - 1
    m.phenyl(dummy, 2.05, 180.0)
    del m.symbols[dummy], m.points[dummy], m.parents[dummy]


def _heterocyclic_carbene(m: Molecule) -> None:
    carbon = m.donor("C", 2.10, 0.0)
    for dihedral in (0.0, 180.0):
        nitrogen = m.grow("N", carbon, 1.36, 124.0, dihedral)
        for turn in (0.0, 180.0):
            m.methyl(nitrogen, 1.45, 121.0, turn)


def _azido(m: Molecule) -> None:
    _chain(("N", 1.95, 0, 0), ("N", 1.20, 125.0, 60.0), ("N", 1.14, 177.0, 0.0))(m)


def _thiocyanato(m: Molecule) -> None:
    _chain(("N", 2.00, 0, 0), ("C", 1.16, 172.0, 0.0), ("S", 1.62, 178.0, 0.0))(m)


def _trimethylsiloxo(m: Molecule) -> None:
    silicon = m.grow("Si", m.donor("O", 1.78, 0.0), 1.64, 150.0, 60.0)
    for dihedral in AZIMUTHS_3:
        m.methyl(silicon, 1.86, 110.0, dihedral)


CASES: dict[str, Case] = {
    name: (_on_chloride(metal, length, add), kind, charge)
    for name, metal, length, add, kind, charge in (
        ("hydroxo", "Ti", 2.22, _hydroxo, DonorKind.HYDROXO, -1),
        ("acetato", "Ti", 2.22, _acetato, DonorKind.CARBOXYLATO, -1),
        ("chelating nitrato", "V", 2.22, _chelating_nitrato, DonorKind.OXOANION, -1),
        ("sulfato", "V", 2.22, _sulfato, DonorKind.OXOANION, -2),
        ("peroxo, side-on", "V", 2.22, _side_on("O", 0.73, 1.72), DonorKind.PEROXO_SIDE_ON, -2),
        ("superoxo, side-on", "Cr", 2.22, _side_on("O", 0.66, 1.80), DonorKind.SUPEROXO, -1),
        (
            "superoxo, end-on",
            "Co",
            2.27,
            _chain(("O", 1.89, 0, 0), ("O", 1.28, 120.0, 60.0)),
            DonorKind.SUPEROXO,
            -1,
        ),
        (
            "hydroperoxo",
            "Fe",
            2.27,
            _chain(("O", 1.86, 0, 0), ("O", 1.46, 115.0, 60.0), ("H", 0.97, 101.0, 90.0)),
            DonorKind.PEROXO_END_ON,
            -1,
        ),
        ("ethylene", "Pt", 2.30, _ethylene, DonorKind.SIDE_ON_CARBON, 0),
        ("acetylacetonato", "Ti", 2.22, _acetylacetonato, DonorKind.ETHER, -1),
        ("ether", "Ti", 2.22, _ether, DonorKind.ETHER, 0),
        ("acetonitrile", "Ti", 2.22, _acetonitrile, DonorKind.NITRILE, 0),
        ("pyridine", "Ti", 2.22, _pyridine, DonorKind.NITROGEN, 0),
        ("azido", "Ti", 2.22, _azido, DonorKind.NITROGEN, -1),
        ("thiocyanato", "Ti", 2.22, _thiocyanato, DonorKind.NITROGEN, -1),
        ("phosphine", "Ti", 2.22, _phosphine, DonorKind.PHOSPHINE, 0),
        ("thiolato", "Ti", 2.22, _thiolato, DonorKind.THIOLATO, -1),
        ("siloxo", "Ti", 2.22, _trimethylsiloxo, DonorKind.ALKOXO, -1),
        ("methyl", "Ti", 2.22, _methyl, DonorKind.ALKYL, -1),
        ("phenyl", "Ti", 2.22, _phenyl, DonorKind.ALKYL, -1),
        ("hydrido", "Ti", 2.22, _chain(("H", 1.70, 0, 0)), DonorKind.HYDRIDO, -1),
        ("diaminocarbene", "Ti", 2.22, _heterocyclic_carbene, DonorKind.CARBENE, 0),
        ("bare O at 1.86", "Ti", 2.22, _chain(("O", 1.86, 0, 0)), DonorKind.HYDROXO_DOUBTFUL, None),
        ("bare O at 2.10", "Ti", 2.22, _chain(("O", 2.10, 0, 0)), DonorKind.AQUA_DOUBTFUL, None),
        ("bare N at 2.15", "Ti", 2.22, _chain(("N", 2.15, 0, 0)), DonorKind.NITROGEN, None),
        ("sulfido", "Ti", 2.22, _chain(("S", 2.10, 0, 0)), DonorKind.SULFIDO, -2),
    )
}


def dichromate() -> Fragment:
    """Cr2O7 2-: Cr-O 1.616 and 1.782 (Acta Cryst. C56, 629 (2000); read); Cr-O-Cr 124 idealised."""
    molecule = Molecule("Cr")
    bridge = molecule.donor("O", 1.782, 0.0)
    for phi in AZIMUTHS_3:
        molecule.donor("O", 1.616, TETRAHEDRAL_DEG, phi)
    second = molecule.grow("Cr", bridge, 1.782, 124.0, 180.0)
    for dihedral in (60.0, 180.0, 300.0):
        molecule.grow("O", second, 1.616, TETRAHEDRAL_DEG, dihedral)
    return _fragment(molecule)


def ferrocene() -> Fragment:
    """Eclipsed ferrocene: Fe-C 2.05, C-C 1.42 (typical values; common practice)."""
    molecule = Molecule("Fe")
    for z in (1.65, -1.65):
        for k in range(5):
            turn = np.radians(72.0 * k)
            outward = np.array([np.cos(turn), np.sin(turn), 0.0])
            carbon = molecule.put("C", 1.21 * outward + np.array([0.0, 0.0, z]))
            molecule.put("H", 2.29 * outward + np.array([0.0, 0.0, z]), carbon)
    return _fragment(molecule)


def titanyl_porphyrin() -> Fragment:
    """TiO(porphine), planar ring 0.56 below Ti; Ti=O 1.613 (Guilard et al., Inorg. Chem. 17, 1228 (1978); memory)."""
    molecule = Molecule("Ti")
    molecule.donor("O", 1.613, 0.0)
    quarter = (
        ("N", 2.05, 0.0),
        ("C", 2.87, 1.10),
        ("C", 2.87, -1.10),
        ("C", 4.22, 0.68),
        ("C", 4.22, -0.68),
        ("C", 2.43, 2.43),
        ("H", 5.05, 1.37),
        ("H", 5.05, -1.37),
        ("H", 3.19, 3.19),
    )
    for k in range(4):
        c, s = np.cos(np.pi * k / 2), np.sin(np.pi * k / 2)
        for symbol, x, y in quarter:
            molecule.put(symbol, np.array([c * x - s * y, s * x + c * y, -0.56]))
    return _fragment(molecule)
