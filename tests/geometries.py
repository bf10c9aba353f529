"""Molecules for the tests, built from published lengths and angles.

A source ends with `memory` or `read`: whether the figures were recalled or seen. Where it says idealised, the
angles are those of the regular polyhedron; OH2, CH3, C6H5 and the like always have idealised inner lengths.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from ehmo.records.fragment import Fragment
from tests.molecule_builder import TETRAHEDRAL_DEG, X_AXIS, Molecule


@dataclass(frozen=True)
class Species:
    """A molecule with its charge, unpaired electrons and the source of its lengths."""

    name: str
    symbols: tuple[str, ...]
    positions_A: np.ndarray
    charge: int
    unpaired_electrons: int
    source: str

    def fragment(self) -> Fragment:
        """The molecule as a fragment with charge and unpaired electrons set."""
        return Fragment(
            self.symbols,
            self.positions_A,
            self.charge,
            self.unpaired_electrons,
            title=self.name,
            source=self.name,
        )

    def bare(self) -> Fragment:
        """The molecule without charge and unpaired electrons."""
        return Fragment(self.symbols, self.positions_A, title=self.name, source=self.name)


SPECIES: dict[str, Species] = {}
AZIMUTHS_4 = (0.0, 90.0, 180.0, 270.0)
AZIMUTHS_3 = (0.0, 120.0, 240.0)
OCTAHEDRON = ((0.0, 0.0), (180.0, 0.0), *((90.0, phi) for phi in AZIMUTHS_4))
TETRAHEDRON = ((0.0, 0.0), *((TETRAHEDRAL_DEG, phi) for phi in AZIMUTHS_3))


def _record(name: str, molecule: Molecule, charge: int, unpaired: int, source: str) -> None:
    positions = np.array(molecule.points)
    positions.setflags(write=False)
    SPECIES[name] = Species(name, tuple(molecule.symbols), positions, charge, unpaired, source)


def _sphere(metal: str, donors: list[tuple[str, float, float, float]]) -> Molecule:
    molecule = Molecule(metal)
    for symbol, length, theta, phi in donors:
        molecule.donor(symbol, length, theta, phi)
    return molecule


def _apical(metal: str, apex: tuple[str, float], base: tuple[str, float], angle: float, fold: int) -> Molecule:
    """A short apical bond over three or four equal basal donors."""
    turns = AZIMUTHS_3 if fold == 3 else AZIMUTHS_4
    return _sphere(metal, [(*apex, 0.0, 0.0), *((*base, angle, phi) for phi in turns)])


def _aqua_oxo(metal: str, oxo: float, equatorial: float, trans: float, angle: float) -> Molecule:
    molecule = Molecule(metal)
    molecule.donor("O", oxo, 0.0)
    for phi in AZIMUTHS_4:
        molecule.water(equatorial, angle, phi)
    molecule.water(trans, 180.0, toward=X_AXIS)
    return molecule


def _actinyl(metal: str, oxo: float, water: float | None) -> Molecule:
    molecule = _sphere(metal, [("O", oxo, 0.0, 0.0), ("O", oxo, 180.0, 0.0)])
    for k in range(5 if water else 0):
        molecule.water(water, 90.0, 72.0 * k)
    return molecule


def _hexaaqua(metal: str, length: float) -> Molecule:
    molecule = Molecule(metal)
    for (theta, phi), toward in zip(OCTAHEDRON, ((1, 0, 0), (1, 0, 0), *4 * ((0, 0, 1),)), strict=True):
        # Th: waters on z lie in xz, on x in xy, on y in yz
        molecule.water(length, theta, phi, toward=(0, 1, 0) if theta == 90.0 and phi in (0.0, 180.0) else toward)
    return molecule


def _everywhere(metal: str, places, add: Callable[[Molecule, float, float], object]) -> Molecule:
    molecule = Molecule(metal)
    for theta, phi in places:
        add(molecule, theta, phi)
    return molecule


def _add_oxo_species() -> None:
    _record(
        "[VO(OH2)5]2+",
        _aqua_oxo("V", 1.591, 2.035, 2.223, 98.0),
        2,
        1,
        "Tachez, Theobald, Watson, Mercier, Acta Cryst. B35, 1545 (1979), VOSO4.5H2O; idealised; memory",
    )
    _record(
        "[FeO(OH2)5]2+",
        _aqua_oxo("Fe", 1.62, 2.08, 2.11, 93.0),
        2,
        4,
        "Pestovsky et al., Angew. Chem. Int. Ed. 44, 6871 (2005), Fe=O by EXAFS; rest idealised; memory",
    )
    _record("[CrO(OH2)5]2+", _aqua_oxo("Cr", 1.60, 2.02, 2.20, 97.0), 2, 2, "idealised; memory")
    _record(
        "VOCl3",
        _apical("V", ("O", 1.571), ("Cl", 2.137), 107.88, 3),
        0,
        0,
        "Oberhammer, Straehle, Z. Naturforsch. A 30, 296 (1975), gas; Cl-V-Cl 111.0; read",
    )
    chromyl = [("O", 1.581, 54.25, phi) for phi in (0.0, 180.0)]
    chromyl += [("Cl", 2.126, 180.0 - 56.65, phi) for phi in (90.0, 270.0)]
    source = "Marsden, Hedberg, Hedberg, Inorg. Chem. 21, 1115 (1982), gas; memory"
    _record("CrO2Cl2", _sphere("Cr", chromyl), 0, 0, source)
    for name, metal, length, charge, unpaired, source in (
        ("VO4 3-", "V", 1.705, -3, 0, "Z. Kristallogr. 131, 161 (1970), Ba3(VO4)2; read"),
        ("CrO4 2-", "Cr", 1.643, -2, 0, "McGinnety, Acta Cryst. B28, 2845 (1972), K2CrO4; read"),
        ("MnO4 -", "Mn", 1.629, -1, 0, "Palenik, Inorg. Chem. 6, 503 (1967), KMnO4; memory"),
        (
            "FeO4 2-",
            "Fe",
            1.656,
            -2,
            2,
            "Hoppe, Schwedhelm, Fricke, Z. Anorg. Allg. Chem. (1982), K2FeO4; memory",
        ),
        ("MoO4 2-", "Mo", 1.772, -2, 0, "Fortes, Acta Cryst. E71, 592 (2015), Na2MoO4; read"),
        ("TcO4 -", "Tc", 1.711, -1, 0, "Krebs, Hasse, Acta Cryst. B32, 1334 (1976), KTcO4; memory"),
        ("RuO4", "Ru", 1.706, 0, 0, "Schaefer, Seip, Acta Chem. Scand. 21, 737 (1967), gas; memory"),
        ("WO4 2-", "W", 1.783, -2, 0, "Fortes, Acta Cryst. E71, 592 (2015), Na2WO4; read"),
        ("ReO4 -", "Re", 1.723, -1, 0, "Lock, Turner, Acta Cryst. B31, 1764 (1975), KReO4; memory"),
        ("OsO4", "Os", 1.712, 0, 0, "Seip, Stoelevik, Acta Chem. Scand. 20, 385 (1966), gas; memory"),
        ("MnO4 3-", "Mn", 1.72, -3, 2, "Dardenne et al., J. Solid State Chem. 146, 464 (1999); read"),
    ):
        oxo = [("O", length, theta, phi) for theta, phi in TETRAHEDRON]
        _record(name, _sphere(metal, oxo), charge, unpaired, f"{source}; Td idealised")
    for symbol, oxo, water, unpaired in (("U", 1.76, 2.41, 0), ("Np", 1.75, 2.42, 1), ("Pu", 1.74, 2.41, 2)):
        source = "EXAFS of the aqueous ion, consensus of several papers; memory"
        _record(f"{symbol}O2 2+", _actinyl(symbol, oxo, None), 2, unpaired, source)
        _record(f"[{symbol}O2(OH2)5]2+", _actinyl(symbol, oxo, water), 2, unpaired, source)


def _add_square_pyramids() -> None:
    for name, metal, apex, base, angle, charge, unpaired, source in (
        ("[VOCl4]2-", "V", ("O", 1.57), 2.35, 102.0, -2, 1, "various salts, typical; memory"),
        (
            "[TiOCl4]2-",
            "Ti",
            ("O", 1.79),
            2.35,
            105.0,
            -2,
            0,
            "Haase, Hoppe, Acta Cryst. B24, 281 (1968); memory",
        ),
        (
            "[MoOCl4]-",
            "Mo",
            ("O", 1.61),
            2.333,
            105.2,
            -1,
            1,
            "Garner et al., J. Chem. Soc. Dalton 1977, 853; read",
        ),
        (
            "[TcOCl4]-",
            "Tc",
            ("O", 1.61),
            2.31,
            106.0,
            -1,
            0,
            "Cotton et al., Inorg. Chem. 18, 3024 (1979); read",
        ),
        (
            "[ReOCl4]-",
            "Re",
            ("O", 1.63),
            2.34,
            105.5,
            -1,
            0,
            "typical of tetrachloridooxidorhenates(V); memory",
        ),
        (
            "[MoNCl4]-",
            "Mo",
            ("N", 1.64),
            2.34,
            102.0,
            -1,
            0,
            "Knopp et al., Z. Naturforsch. B32, 1361 (1977); memory",
        ),
        (
            "[CrNCl4]2-",
            "Cr",
            ("N", 1.555),
            2.2912,
            101.24,
            -2,
            1,
            "Birk, Bendix, Inorg. Chem. (abstract); read",
        ),
        (
            "[RuNCl4]-",
            "Ru",
            ("N", 1.57),
            2.31,
            104.6,
            -1,
            0,
            "Phillips, Skapski, Acta Cryst. B31 (1975); memory",
        ),
    ):
        _record(name, _apical(metal, apex, ("Cl", base), angle, 4), charge, unpaired, source)
    halides = [
        ("O", 1.66, 0.0, 0.0),
        *(("Cl", 2.40, 95.0, phi) for phi in AZIMUTHS_4),
        ("Cl", 2.60, 180.0, 0.0),
    ]
    _record("[MoOCl5]2-", _sphere("Mo", halides), -2, 1, "K and Rb salts, typical; memory")


def _add_six_coordinate_polyoxo() -> None:
    cis = [("O", 1.70, 51.0, phi) for phi in (0.0, 180.0)] + [("Cl", 2.40, 90.0, phi) for phi in (90.0, 270.0)]
    cis += [("Cl", 2.60, 138.0, phi) for phi in (0.0, 180.0)]
    _record("cis-[MoO2Cl4]2-", _sphere("Mo", cis), -2, 0, "idealised on O=Mo=O 102; memory")
    trans = [("O", 1.75, theta, 0.0) for theta in (0.0, 180.0)] + [("Cl", 2.38, 90.0, phi) for phi in AZIMUTHS_4]
    _record("trans-[OsO2Cl4]2-", _sphere("Os", trans), -2, 0, "Kruse, Acta Cryst. 14, 1035 (1961); memory")
    facial = [("O", 1.75, 58.0, phi) for phi in AZIMUTHS_3] + [("F", 2.11, 128.0, phi + 180) for phi in AZIMUTHS_3]
    _record("fac-[MoO3F3]3-", _sphere("Mo", facial), -3, 0, "idealised on O=Mo=O 94.5; memory")
    rhenium = _sphere("Re", [("O", 1.703, 106.4, phi) for phi in AZIMUTHS_3])
    rhenium.hydrogens(rhenium.donor("C", 2.074, 0.0), 3)
    source = "Wikrent et al., J. Chem. Phys. 107, 2187 (1997), gas; C-Re-O 106.4; read"
    _record("CH3ReO3", rhenium, 0, 0, source)


def _add_nitrogen_species() -> None:
    imido = _sphere("V", [("Cl", 2.19, 104.0, phi) for phi in AZIMUTHS_3])
    imido.phenyl(imido.donor("N", 1.638, 0.0), 1.37, 178.0)
    source = "Maatta, Inorg. Chem. 23, 2560 (1984), p-tolyl compound; V-Cl, N-C idealised; memory"
    _record("V(NC6H5)Cl3", imido, 0, 0, source)
    simple = _sphere("V", [("Cl", 2.19, 104.0, phi) for phi in AZIMUTHS_3])
    simple.grow("H", simple.donor("N", 1.638, 0.0), 1.01, 179.9)
    _record("V(NH)Cl3", simple, 0, 0, "as V(NC6H5)Cl3 with H in place of the phenyl group; idealised; memory")
    bent = _sphere("Mo", [("O", 1.70, 110.0, 0.0), ("Cl", 2.36, 110.0, 120.0), ("Cl", 2.36, 110.0, 240.0)])
    bent.methyl(bent.donor("N", 1.79, 0.0), 1.44, 139.4, 60.0)
    source = "Mo-N, Mo-N-C of Haymore, Maatta, Wentworth (1979), bent imido; rest idealised; memory"
    _record("MoO(NCH3)Cl2, bent", bent, 0, 0, source)
    amido = _sphere("Ti", [("Cl", 2.22, 110.0, phi) for phi in AZIMUTHS_3])
    nitrogen = amido.donor("N", 1.85, 0.0)
    for dihedral in (0.0, 180.0):
        amido.methyl(nitrogen, 1.46, 124.0, dihedral)
    _record(
        "Ti(NMe2)Cl3",
        amido,
        0,
        0,
        "Ti-N 1.85, planar N, typical of amidotitanium chlorides; idealised; memory",
    )

    def dimethylamido(molecule: Molecule, theta: float, phi: float) -> None:
        donor = molecule.donor("N", 1.917, theta, phi)
        for dihedral in (0.0, 180.0):
            molecule.methyl(donor, 1.46, 124.4, dihedral)

    _record(
        "Ti(NMe2)4",
        _everywhere("Ti", TETRAHEDRON, dimethylamido),
        0,
        0,
        "Haaland et al., J. Chem. Soc. Dalton Trans. (1999), gas, Ti-N 1.917; Td core idealised; memory",
    )
    source = "Kime, Ibers, Acta Cryst. B25, 168 (1969), Co-N 1.963; memory"
    _record("[Co(NH3)6]3+", _everywhere("Co", OCTAHEDRON, lambda m, t, p: m.ammine(1.963, t, p)), 3, 0, source)


def _add_oxygen_ligands() -> None:
    def methoxo(length: float, angle: float):
        return lambda m, t, p: m.methyl(m.donor("O", length, t, p), 1.42, angle, 60.0)

    alkoxo = _everywhere("V", TETRAHEDRON[1:], methoxo(1.76, 130.0))
    alkoxo.donor("O", 1.595, 0.0)
    _record("VO(OCH3)3", alkoxo, 0, 0, "monomer, idealised on typical vanadyl alkoxides; memory")
    alkoxo = _everywhere("Ti", TETRAHEDRON, methoxo(1.78, 150.0))
    _record("Ti(OCH3)4", alkoxo, 0, 0, "monomer, idealised on typical terminal alkoxides; memory")
    for name, metal, length, charge, unpaired, source in (
        ("[Ti(OH2)6]3+", "Ti", 2.028, 3, 1, "Tachikawa et al., Cs alum; memory"),
        ("[V(OH2)6]3+", "V", 1.992, 3, 2, "Beattie, Best, Skelton, White (1981), Cs alum; memory"),
        ("[V(OH2)6]2+", "V", 2.128, 2, 3, "Cotton et al., Inorg. Chem. 32, 4861 (1993), Tutton salt; memory"),
        ("[Cr(OH2)6]3+", "Cr", 1.96, 3, 3, "Beattie, Best, Skelton, White (1981), Cs alum; memory"),
        ("[Mn(OH2)6]2+", "Mn", 2.177, 2, 5, "Cotton et al., Inorg. Chem. 32, 4861 (1993); memory"),
        ("[Fe(OH2)6]2+", "Fe", 2.130, 2, 4, "Cotton et al., Inorg. Chem. 32, 4861 (1993); memory"),
        ("[Fe(OH2)6]3+", "Fe", 1.995, 3, 5, "Beattie, Best, Skelton, White (1981), Cs alum; memory"),
        ("[Co(OH2)6]2+", "Co", 2.095, 2, 3, "Cotton et al., Inorg. Chem. 32, 4861 (1993); memory"),
        ("[Ni(OH2)6]2+", "Ni", 2.056, 2, 2, "Cotton et al., Inorg. Chem. 32, 4861 (1993); memory"),
    ):
        _record(name, _hexaaqua(metal, length), charge, unpaired, f"{source}; Th idealised")


def _add_carbon_species() -> None:
    carbene = _sphere("Ta", [("Cl", 2.30, 110.0, phi) for phi in AZIMUTHS_3])
    carbene.hydrogens(carbene.donor("C", 1.90, 0.0), 2, 1.09, 122.0)
    _record("Ta(CH2)Cl3", carbene, 0, 0, "Ta=C 1.90, typical of alkylidenes of tantalum(V); idealised; memory")
    source = "Mills, Redhouse, J. Chem. Soc. A 1968, 642, Cr-C 2.04; rest idealised; memory"
    fischer = _everywhere("Cr", OCTAHEDRON[1:], lambda m, t, p: m.diatomic("C", "O", (1.89, 1.14), t, p))
    carbon = fischer.donor("C", 2.04, 0.0)
    fischer.methyl(carbon, 1.51, 124.0, 45.0)
    fischer.methyl(fischer.grow("O", carbon, 1.33, 120.0, 225.0), 1.43, 121.0, 180.0)
    _record("Cr(CO)5(C(OMe)Me)", fischer, 0, 0, source)
    carbyne = _everywhere("W", TETRAHEDRON[1:], lambda m, t, p: m.methyl(m.donor("O", 1.865, t, p), 1.42, 138.0, 60.0))
    carbyne.methyl(carbyne.donor("C", 1.758, 0.0), 1.48, 179.9)
    source = "Cotton, Schwotzer, Shamshoum, Organometallics 3, 1770 (1984), W(CPh)(OCMe3)3; idealised; memory"
    _record("W(CCH3)(OCH3)3", carbyne, 0, 0, source)
    simple = _sphere("W", [("Cl", 2.28, 108.0, phi) for phi in AZIMUTHS_3])
    simple.hydrogens(simple.donor("C", 1.76, 0.0), 1, 1.08, 179.9)
    _record("W(CH)Cl3", simple, 0, 0, "as W(CCH3)(OCH3)3 with H and Cl in place of the groups; idealised; memory")
    carbonyl = _everywhere("Cr", OCTAHEDRON, lambda m, t, p: m.diatomic("C", "O", (1.914, 1.140), t, p))
    _record("Cr(CO)6", carbonyl, 0, 0, "Jost, Rees, Yelon, Acta Cryst. B31, 2649 (1975), neutron; memory")


def _add_controls() -> None:
    prusside = _everywhere("Fe", OCTAHEDRON[1:], lambda m, t, p: m.diatomic("C", "N", (1.935, 1.16), t, p))
    prusside.diatomic("N", "O", (1.653, 1.124), 0.0)
    source = "Bottomley, White, Acta Cryst. B35, 2193 (1979), Na salt; idealised angles; memory"
    _record("[Fe(CN)5(NO)]2-", prusside, -2, 0, source)
    cobalt = _everywhere("Co", OCTAHEDRON[1:], lambda m, t, p: m.ammine(1.98, t, p))
    cobalt.grow("O", cobalt.donor("N", 1.871, 0.0), 1.154, 119.0, 45.0)
    source = "Pratt, Coyle, Ibers, J. Chem. Soc. A 1971, 2146, Co-N-O 119; Co-NH3 idealised; memory"
    _record("[Co(NH3)5(NO)]2+", cobalt, 2, 0, source)
    chloride = [("Cl", 2.170, theta, phi) for theta, phi in TETRAHEDRON]
    _record("TiCl4", _sphere("Ti", chloride), 0, 0, "Morino, Uehara, J. Chem. Phys. 45, 4543 (1966), gas; memory")
    chloride = [("Cl", 2.26, theta, phi) for theta, phi in TETRAHEDRON]
    _record("[CoCl4]2-", _sphere("Co", chloride), -2, 3, "Cs3CoCl5, typical; memory")
    fluoride = [("F", 1.86, theta, phi) for theta, phi in OCTAHEDRON]
    _record("[TiF6]2-", _sphere("Ti", fluoride), -2, 0, "K2TiF6, several refinements; memory")
    sulfido = _sphere("V", [("O", 1.673, 0.0, 0.0), *(("S", 2.182, 107.1, phi) for phi in AZIMUTHS_3)])
    _record("VOS3 3-", sulfido, -3, 0, "Huang, Ibers, Acta Cryst. E60, i6 (2004), Na3VOS3; read")
    sulfido = _sphere("Mo", [("S", 2.18, theta, phi) for theta, phi in TETRAHEDRON])
    _record("MoS4 2-", sulfido, -2, 0, "ammonium salt, typical; memory")


_add_oxo_species()
_add_square_pyramids()
_add_six_coordinate_polyoxo()
_add_nitrogen_species()
_add_oxygen_ligands()
_add_carbon_species()
_add_controls()
