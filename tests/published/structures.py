"""More molecules for the published values and trends, and spheres of minerals for bond-valence sums.

As in tests.geometries, a source ends with `read` or `memory`; angles that it does not give are idealised. Macrocycles
are cut down to what the metal sees of them: porphine for substituted porphyrins, ammine ligands for cyclic amines.
"""

from __future__ import annotations

from dataclasses import dataclass
from math import sqrt

import numpy as np

from ehmo.structure.elements import valence_d_or_f_electrons
from tests.geometries import AZIMUTHS_3, AZIMUTHS_4, OCTAHEDRON, SPECIES, TETRAHEDRON, Species
from tests.molecule_builder import X_AXIS, Molecule, polar

STRUCTURES: dict[str, Species] = dict(SPECIES)
"""All molecules by name, those of tests.geometries included."""

Donor = tuple[str, float, float, float]
"""Symbol, length, polar angle and azimuth."""


def record(name: str, molecule: Molecule, charge: int, unpaired: int, source: str) -> None:
    """Keep a molecule under its name."""
    positions = np.array(molecule.points)
    positions.setflags(write=False)
    STRUCTURES[name] = Species(name, tuple(molecule.symbols), positions, charge, unpaired, source)


def sphere(metal: str, *donors: Donor) -> Molecule:
    """Metal with donors that carry nothing."""
    molecule = Molecule(metal)
    for symbol, length, theta, phi in donors:
        molecule.donor(symbol, length, theta, phi)
    return molecule


def ring(symbol: str, length: float, theta: float, azimuths=AZIMUTHS_4) -> tuple[Donor, ...]:
    """Equal donors around the axis."""
    return tuple((symbol, length, theta, phi) for phi in azimuths)


def cyanides(molecule: Molecule, length: float, theta: float, *, inner: float = 1.15) -> Molecule:
    """Four cyanido ligands around the axis."""
    for phi in AZIMUTHS_4:
        molecule.diatomic("C", "N", (length, inner), theta, phi)
    return molecule


def ammines(molecule: Molecule, length: float, theta: float) -> Molecule:
    """Four ammine ligands around the axis."""
    for phi in AZIMUTHS_4:
        molecule.ammine(length, theta, phi)
    return molecule


PORPHINE_N_A = 2.04
"""Distance of N from the centre in the core below."""
PORPHINE_CORE_A = {
    # One quarter, N on x: alpha and beta carbons of the pyrrole ring, H on beta, meso carbon and its H. Regular D4h
    # core with N-C 1.38, C-C 1.44, 1.36 and 1.40 (idealised on metalloporphyrins).
    "N": ((PORPHINE_N_A, 0.0),),
    "C": ((2.87, 1.10), (2.87, -1.10), (4.23, 0.68), (4.23, -0.68), (2.43, 2.43)),
    "H": ((5.07, 1.36), (5.07, -1.36), (3.20, 3.20)),
}


def porphine(metal: str, nitrogen_A: float, above_A: float, axial: tuple[Donor, ...]) -> Molecule:
    """Metal above the plane of a porphine ligand, axial donors on it."""
    molecule = sphere(metal, *axial)
    shift = sqrt(nitrogen_A**2 - above_A**2) - PORPHINE_N_A
    for quarter in range(4):
        c, s = ((1, 0), (0, 1), (-1, 0), (0, -1))[quarter]
        for symbol, places in PORPHINE_CORE_A.items():
            for x, y in places:
                # Rings move out or in as wholes, the meso carbons along their diagonal.
                along = (shift, 0.0) if abs(x - y) > 1e-9 else (shift / 2, shift / 2)
                u, v = x + along[0], y + along[1]
                molecule.put(symbol, np.array([c * u - s * v, s * u + c * v, -above_A]))
    return molecule


def _add_d0_and_gas_phase() -> None:
    kolitsch = "Kolitsch, Acta Cryst. E58, i105 (2002), KCrO3Cl; O-Cr-Cl 108.4; read"
    record("CrO3Cl -", sphere("Cr", *ring("O", 1.597, 108.4, AZIMUTHS_3), ("Cl", 2.192, 0, 0)), -1, 0, kolitsch)
    source = "J. Appl. Cryst. 9 (1976), doi 10.1107/S0021889876011990, K salt; Td angles; read"
    nitrido = (("N", 1.63, *TETRAHEDRON[0]), *(("O", 1.78, *place) for place in TETRAHEDRON[1:]))
    record("OsO3N -", sphere("Os", *nitrido), -1, 0, source)
    source = "Lotspeich, Javan, Engelbrecht, J. Chem. Phys. 31, 633 (1959), gas; Td angles; memory"
    fluoride = (("F", 1.859, *TETRAHEDRON[0]), *(("O", 1.692, *place) for place in TETRAHEDRON[1:]))
    record("ReO3F", sphere("Re", *fluoride), 0, 0, source)
    for name, metal, apex, base, angle, charge, unpaired, source in (
        (
            "CrOF4",
            "Cr",
            ("O", 1.547),
            ("F", 1.726),
            103.7,
            0,
            0,
            "Huang, Hedberg, Shreeve, Gard, gas ED (1984); memory",
        ),
        ("MoOCl4", "Mo", ("O", 1.658), ("Cl", 2.279), 102.8, 0, 0, "Iijima, Shibata (1975), gas; memory"),
        ("WOCl4", "W", ("O", 1.685), ("Cl", 2.280), 102.6, 0, 0, "Iijima, Shibata (1974), gas; memory"),
        ("ReOCl4", "Re", ("O", 1.663), ("Cl", 2.270), 105.5, 0, 1, "Hagen, Hobson, Rice, Turp (1985), gas; memory"),
        ("OsOCl4", "Os", ("O", 1.663), ("Cl", 2.258), 108.3, 0, 0, "Hagen, Hobson, Holwill, Rice (1986), gas; memory"),
        ("[CrOCl4]-", "Cr", ("O", 1.55), ("Cl", 2.24), 104.5, -1, 1, "typical of its salts; memory"),
        ("[WNCl4]-", "W", ("N", 1.67), ("Cl", 2.31), 103.0, -1, 0, "typical of its salts; memory"),
        ("[ReNCl4]-", "Re", ("N", 1.58), ("Cl", 2.32), 103.5, -1, 1, "typical of its salts; memory"),
        ("[TcNCl4]-", "Tc", ("N", 1.581), ("Cl", 2.322), 103.3, -1, 1, "Baldas et al. (1984), AsPh4 salt; memory"),
        ("[OsNCl4]-", "Os", ("N", 1.604), ("Cl", 2.310), 104.5, -1, 0, "Phillips, Skapski (1975), AsPh4 salt; memory"),
        ("[TcNF4]-", "Tc", ("N", 1.60), ("F", 1.90), 103.0, -1, 1, "idealised on nitridotechnetates; memory"),
    ):
        record(name, sphere(metal, (*apex, 0, 0), *ring(*base, angle)), charge, unpaired, source)
    halides = (("O", 1.68, 0, 0), *ring("Cl", 2.40, 95.0), ("Cl", 2.56, 180.0, 0))
    record("[WOCl5]2-", sphere("W", *halides), -2, 1, "typical of its salts; memory")


def _add_cyanides() -> None:
    for name, metal, oxo, carbon, charge, source in (
        ("trans-[MoO2(CN)4]4-", "Mo", 1.834, 2.20, -4, "Day, Hoard, J. Am. Chem. Soc. 90, 3374 (1968); memory"),
        ("trans-[ReO2(CN)4]3-", "Re", 1.781, 2.13, -3, "Murmann, Schlemper, Inorg. Chem. 10, 2352 (1971); memory"),
    ):
        record(
            name,
            cyanides(sphere(metal, *((("O", oxo, t, 0.0)) for t in (0.0, 180.0))), carbon, 90.0),
            charge,
            0,
            source,
        )
    for name, metal, (apex, short), carbon, water, charge, source in (
        ("[MoO(OH2)(CN)4]2-", "Mo", ("O", 1.72), 2.16, 2.27, -2, "Mo=O of the abstract, read; rest typical, memory"),
        ("[ReO(OH2)(CN)4]-", "Re", ("O", 1.667), 2.11, 2.142, -1, "Purcell et al. (1989-90), AsPh4 salt; memory"),
        (
            "[ReN(OH2)(CN)4]2-",
            "Re",
            ("N", 1.639),
            2.11,
            2.496,
            -2,
            "Purcell et al., Transition Met. Chem. (1992); read",
        ),
    ):
        molecule = cyanides(sphere(metal, (apex, short, 0.0, 0.0)), carbon, 99.0)
        molecule.water(water, 180.0, toward=X_AXIS)
        record(name, molecule, charge, 0, source)
    molecule = cyanides(sphere("Mn", ("N", 1.50, 0.0, 0.0)), 1.99, 98.0)
    molecule.diatomic("C", "N", (2.24, 1.15), 180.0)
    record("[MnN(CN)5]3-", molecule, -3, 0, "Bendix et al., Inorg. Chem. 39, 930 (2000), typical lengths; memory")


def _add_macrocycles() -> None:
    for name, metal, oxo, nitrogen, above, unpaired, source in (
        ("TiO(porphine)", "Ti", 1.613, 2.11, 0.56, 0, "Guilard et al., Inorg. Chem. 17, 1228 (1978), OEP; memory"),
        ("VO(porphine)", "V", 1.62, 2.10, 0.54, 1, "Molinaro, Ibers, Inorg. Chem. 15, 2278 (1976), OEP; memory"),
        ("CrO(porphine)", "Cr", 1.572, 2.032, 0.469, 0, "Groves et al., Inorg. Chem. 21, 1363 (1982), TPP; memory"),
        (
            "MnO(porphine)",
            "Mn",
            1.69,
            2.02,
            0.40,
            3,
            "Charnock et al., Angew. Chem. 34, 343 (1995), Mn=O by EXAFS; read",
        ),
        (
            "MoO(porphine)",
            "Mo",
            1.656,
            2.11,
            0.64,
            0,
            "Diebold, Chevrier, Weiss, Inorg. Chem. 18, 1193 (1979), TTP; memory",
        ),
    ):
        record(
            name,
            porphine(metal, nitrogen, above, (("O", oxo, 0.0, 0.0),)),
            0,
            unpaired,
            f"{source}; porphine idealised",
        )
    source = "Rohde et al., Science 299, 1037 (2003), Fe=O 1.646, TMC as four ammine ligands; memory"
    iron = ammines(sphere("Fe", ("O", 1.646, 0.0, 0.0)), 2.09, 92.0)
    methyl = iron.diatomic("N", "C", (2.058, 1.14), 180.0) + 1
    iron.methyl(methyl, 1.46, 179.9)
    record("[FeO(NH3)4(NCCH3)]2+", iron, 2, 2, source)
    source = "Mak, Che, Wong, J. Chem. Soc. Chem. Commun. 1985, 986, Ru=O, TMC as four ammine ligands; memory"
    dioxo = sphere("Ru", *(("O", 1.705, t, 0.0) for t in (0.0, 180.0)))
    record("trans-[RuO2(NH3)4]2+", ammines(dioxo, 2.11, 90.0), 2, 0, source)
    source = "Cheng, Cheung, Che et al. (1994), Ru=O 1.815, chelates as five ammine ligands; memory"
    mono = ammines(sphere("Ru", ("O", 1.815, 0.0, 0.0)), 2.10, 93.0)
    mono.ammine(2.13, 180.0)
    record("[RuO(NH3)5]2+", mono, 2, 2, source)
    source = "Tc=O 1.747 as in the bis(ethylenediamine) ion (1981), typical; memory"
    dioxo = sphere("Tc", *(("O", 1.747, t, 0.0) for t in (0.0, 180.0)))
    record("trans-[TcO2(NH3)4]+", ammines(dioxo, 2.16, 90.0), 1, 0, source)
    source = "Collins et al., J. Am. Chem. Soc. 112, 899 (1990), Mn=O 1.548, TAML as four planar NH2; memory"
    amide = Molecule("Mn")
    amide.donor("O", 1.548, 0.0)
    for phi in AZIMUTHS_4:
        # Planar, and in the equatorial plane as the amide groups of the macrocycle are.
        nitrogen = amide.donor("N", 1.88, 108.0, phi)
        for dihedral in (0.0, 180.0):
            amide.grow("H", nitrogen, 1.01, 122.0, dihedral, toward=polar(1.0, 90.0, phi + 90.0))
    record("[MnO(NH2)4]-", amide, -1, 0, source)


def _add_actinides_and_controls() -> None:
    dioxo = tuple(("O", 1.774, t, 0.0) for t in (0.0, 180.0))
    source = "Watkin, Denning, Prout, Acta Cryst. C47, 2517 (1991), Cs salt; memory"
    record("[UO2Cl4]2-", sphere("U", *dioxo, *ring("Cl", 2.671, 90.0)), -2, 0, source)
    source = "Bagnall et al. (1979), PPh4 salt, U=O 1.76, trans U-Cl 2.43; memory"
    mono = (("O", 1.76, 0.0, 0.0), *ring("Cl", 2.54, 91.0), ("Cl", 2.43, 180.0, 0.0))
    record("[UOCl5]-", sphere("U", *mono), -1, 0, source)
    methoxide = Molecule("U")
    for theta, phi in OCTAHEDRON:
        methoxide.methyl(methoxide.donor("O", 2.10, theta, phi), 1.40, 153.0, 60.0)
    record("U(OCH3)6", methoxide, 0, 0, "Cuellar, Marks, Miller, Weitz (1983), U-O 2.10; Oh idealised; memory")
    source = "Equilibrium and structural study of chloro complexes of iron(III), EXAFS; Oh angles; read"
    chloro = sphere("Fe", ("Cl", 2.26, 0.0, 0.0))
    for phi in AZIMUTHS_4:
        chloro.water(2.05, 90.0, phi)
    chloro.water(2.05, 180.0, toward=X_AXIS)
    record("[FeCl(OH2)5]2+", chloro, 2, 5, source)
    for name, metal, length, charge, unpaired, source in (
        ("[TiF6]3-", "Ti", 1.909, -3, 1, "C. R. Acad. Sci. 265, 1244 (1967), Na3Li3Ti2F12; read"),
        ("[CrF6]3-", "Cr", 1.899, -3, 3, "Eur. J. Solid State Inorg. Chem. 29, 519 (1992), SrNaCrF6; read"),
    ):
        record(name, sphere(metal, *(("F", length, *place) for place in OCTAHEDRON)), charge, unpaired, source)
    for name, metal, oxo, alkoxo, charge, source in (
        ("CrO2(OCH3)2", "Cr", 1.58, 1.74, 0, "Cr-O as in chromium(VI) esters; idealised; memory"),
        ("MoO2(OCH3)2", "Mo", 1.69, 1.86, 0, "Mo-O as in dioxomolybdenum(VI) alkoxides; idealised; memory"),
    ):
        molecule = sphere(metal, *(("O", oxo, 54.0, phi) for phi in (0.0, 180.0)))
        for phi in (90.0, 270.0):
            molecule.methyl(molecule.donor("O", alkoxo, 125.0, phi), 1.42, 130.0, 60.0)
        record(name, molecule, charge, 0, source)


def aqua_ladder(metal: str, electrons: int) -> Species:
    """MO(H2O)5 with the lengths of aqua vanadyl and a number of d electrons, low spin."""
    model = SPECIES["[VO(OH2)5]2+"]
    state = valence_d_or_f_electrons(metal, 0) - electrons
    symbols = (metal, *model.symbols[1:])
    return Species(f"{metal}O(OH2)5, d{electrons}", symbols, model.positions_A, state - 2, electrons % 2, model.source)


_add_d0_and_gas_phase()
_add_cyanides()
_add_macrocycles()
_add_actinides_and_controls()


@dataclass(frozen=True)
class Sphere:
    """Metal, oxidation state, and donors with their distances, as found in a mineral or a network [angstrom]."""

    metal: str
    oxidation_state: int
    donors: tuple[tuple[str, float], ...]


def _oxygens(*lengths: float | tuple[int, float]) -> tuple[tuple[str, float], ...]:
    """Distances of O; a pair is a number of equal ones and their length."""
    pairs = [(1, length) if isinstance(length, float) else length for length in lengths]
    return tuple(("O", length) for count, length in pairs for _ in range(count))


SPHERES = {
    "VO6 in beta-VOSO4": Sphere("V", 4, _oxygens(1.607, (4, 1.994), 2.267)),
    "VO5 in CoV2P2O14 hydrate": Sphere("V", 4, _oxygens(1.599, (4, 1.971))),
    "VO5 in stibivanite": Sphere("V", 4, _oxygens(1.583, (4, 1.98))),
    "VO5 in haradaite": Sphere("V", 4, _oxygens(1.561, (4, 2.015))),
    "VO5 in cavansite": Sphere("V", 4, _oxygens(1.600, (4, 1.976))),
    "VOF5 in BaVOF4": Sphere("V", 4, (("O", 1.621), *4 * (("F", 1.939),), ("F", 2.193))),
    "VO(OH2)4(OSO3) in anorthominasragrite": Sphere("V", 4, _oxygens(1.588, 2.002, (3, 2.028), 2.254)),
    "VO7 in VO(NO3)3": Sphere("V", 5, _oxygens(1.607, (3, 1.915), (3, 2.258))),
    "VO5 in V2O5": Sphere("V", 5, _oxygens(1.583, 1.781, (2, 1.882), 2.026)),
    "TiO5 in fresnoite": Sphere("Ti", 4, _oxygens(1.671, (4, 1.99))),
    "TiO6 in PbTiO3": Sphere("Ti", 4, _oxygens(1.76, (4, 1.977), 2.411)),
    "CrO4 in K2Cr2O7": Sphere("Cr", 6, _oxygens((3, 1.616), 1.782)),
    "MoO6 in MoO3": Sphere("Mo", 6, _oxygens(1.671, 1.734, (2, 1.948), 2.251, 2.332)),
    "MoO5 in Pb3MoO5Cl2": Sphere("Mo", 6, _oxygens(1.705, (4, 1.913))),
    "MoO6 in MoO2(acac)2": Sphere("Mo", 6, _oxygens((2, 1.69), (2, 1.98), (2, 2.18))),
    "MoO6 in MoAlP2O9": Sphere("Mo", 5, _oxygens(1.653, (4, 1.976), 2.695)),
    "WO6 in tungstite": Sphere("W", 6, _oxygens(1.688, (2, 1.828), (2, 1.927), 2.339)),
    "WO5 in pinalite": Sphere("W", 6, _oxygens(1.699, (4, 1.901))),
    "WO6 in PW12O40 3-": Sphere("W", 6, _oxygens(1.754, (4, 1.962), 2.506)),
    "ReO6 in ReO3": Sphere("Re", 6, _oxygens((6, 1.867))),
    "UO6 in LiUO2PO4 hydrate": Sphere("U", 6, _oxygens((2, 1.772), (4, 2.301))),
    "UO8 in grimselite": Sphere("U", 6, _oxygens((2, 1.783), (6, 2.417))),
    "UO8 in rutherfordine": Sphere("U", 6, _oxygens((2, 1.743), (6, 2.481))),
    "NpO6 in KNpPO6 hydrate": Sphere("Np", 6, _oxygens((2, 1.748), (4, 2.273))),
}
