"""The kind of each donor atom, by what else it is bonded to and at which lengths and angles."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Final

from basis_params.bond_valence import bond_valence_R0
from ehmo.records.coordination import DonorKind
from ehmo.structure.elements import covalent_radius_A
from ehmo.structure.graph import BondGraph

LINEAR_DEG: Final = 150.0
"""Imido and nitrosyl ligands bent further than this count as bent [degree]."""

HYDROXO_VALENCE: Final = 1.15
"""Bare terminal oxygen below this bond valence may be a hydroxo ligand lacking its H [valence units]."""

AQUA_VALENCE: Final = 0.65
"""Bare terminal oxygen below this may be an aqua ligand without its hydrogens [valence units]."""

BRIDGING_VALENCE: Final = 0.25
"""A weaker second bond makes no bridge of an oxo ligand: that of V=O to the next V has 0.1-0.2 (common practice)
[valence units]."""

SUPEROXO_A: Final = 1.38
"""O-O is shorter in superoxo (1.28-1.35), longer in peroxo ligands (1.40-1.52) (common practice) [angstrom]."""

ALKYLIDENE_FRACTION: Final = 0.88
"""Alkylidene bonds are shorter than this times the radii sum, alkyl bonds longer (common practice)."""

_CARBONYL_OXYGEN_A: Final = 1.30  # C=O 1.22, delocalised 1.27, phenolate 1.34, alkoxide 1.41 (common practice)
_TRIPLE_CN_A: Final = 1.22  # nitrile and cyanide 1.14-1.17, imine 1.28 (common practice)
_MULTIPLE_CC_A: Final = 1.42  # aromatic and vinyl C-C below, single C-C above (common practice)
_IMINE_CN_A: Final = 1.34  # imine and azine C=N up to this where one carbon is sp2 (common practice)
_ARYLAMIDE_CN_A: Final = 1.395  # diarylamide C-N above, porphyrin and azole C-N below (common practice)
_OXOANION_CENTRES: Final = frozenset({"P", "S", "Se", "Te", "As", "Sb", "Cl", "Br", "I", "B", "Si", "Ge", "Xe"})
_HALOGENS: Final = frozenset({"F", "Cl", "Br", "I", "At"})


@dataclass(frozen=True, slots=True, eq=False)
class DonorSite:
    """A donor atom as one metal sees it.

    Attributes
    ----------
    graph : BondGraph
    metal, atom : int
    valence : float or None
        Bond valence of this bond [valence units].
    """

    graph: BondGraph
    metal: int
    atom: int
    valence: float | None

    @property
    def others(self) -> tuple[int, ...]:
        """Atoms bonded to the donor, metals left out."""
        return self.graph.neighbours[self.atom]

    @property
    def symbols(self) -> list[str]:
        """Elements of `others`."""
        return [self.graph.symbols[k] for k in self.others]

    @property
    def bridging(self) -> bool:
        """Whether metals share the donor; weak contacts of one multiply bonded to another metal do not count."""
        held = self.graph.metal_neighbours[self.atom]
        if len(held) < 2:
            return False
        graph, donor = self.graph, self.atom
        found = [bond_valence(graph.symbols[m], graph.symbols[donor], graph.distance_A(m, donor)) for m in held]
        if None in found:
            return True
        *_, second, first = sorted(valence for valence in found if valence is not None)
        return first < HYDROXO_VALENCE or second >= BRIDGING_VALENCE

    def length_A(self, other: int) -> float:
        """Distance from the donor to another atom [angstrom]."""
        return self.graph.distance_A(self.atom, other)

    def angle_deg(self, other: int) -> float:
        """Angle metal-donor-other [degree]."""
        return self.graph.angle_deg(self.metal, self.atom, other)

    def weaker_than(self, valence: float) -> bool:
        """Whether the bond valence is known and below a value."""
        return self.valence is not None and self.valence < valence

    def side_on_with(self, symbol: str) -> int | None:
        """Bonded atom of an element that the same metal holds too."""
        graph = self.graph
        return next(
            (k for k in self.others if graph.symbols[k] == symbol and self.metal in graph.metal_neighbours[k]),
            None,
        )


def bond_valence(metal: str, donor: str, length_A: float) -> float | None:
    """Bond valence with R0 for any oxidation state; None where no R0 is tabulated [valence units].

    References
    ----------
    brown-1985
    """
    try:
        row = bond_valence_R0(metal, donor, None)
    except KeyError:
        return None
    return row.valence(length_A)


def donor_kind(site: DonorSite) -> DonorKind:
    """Kind of a donor atom."""
    symbol = site.graph.symbols[site.atom]
    if symbol in _HALOGENS:
        return DonorKind.OTHER if site.others else DonorKind.HALIDE
    by_element: dict[str, Callable[[DonorSite], DonorKind]] = {
        "O": _oxygen,
        "N": _nitrogen,
        "C": _carbon,
        "S": _sulfur,
    }
    if symbol in by_element:
        return by_element[symbol](site)
    if symbol == "H":
        return DonorKind.OTHER if site.others else DonorKind.HYDRIDO
    if symbol in ("P", "As", "Sb") and len(site.others) == 3:
        return DonorKind.PHOSPHINE
    return DonorKind.OTHER


def _oxygen(site: DonorSite) -> DonorKind:
    symbols = site.symbols
    if not symbols:
        return _bare_oxygen(site)
    if "O" in symbols:
        return _dioxygen(site)
    hydrogens = symbols.count("H")
    if hydrogens == len(symbols):
        return DonorKind.HYDROXO if hydrogens == 1 else DonorKind.AQUA
    if len(symbols) > 1:
        return DonorKind.ETHER if "C" in symbols else DonorKind.OTHER
    return _oxygen_of_group(site, site.others[0])


def _bare_oxygen(site: DonorSite) -> DonorKind:
    if site.bridging:
        return DonorKind.BRIDGING_OXO
    if site.weaker_than(AQUA_VALENCE):
        return DonorKind.AQUA_DOUBTFUL
    return DonorKind.HYDROXO_DOUBTFUL if site.weaker_than(HYDROXO_VALENCE) else DonorKind.OXO


def _dioxygen(site: DonorSite) -> DonorKind:
    partner = next(k for k in site.others if site.graph.symbols[k] == "O")
    bare = len(site.others) == 1 and len(site.graph.neighbours[partner]) == 1
    if bare and site.length_A(partner) < SUPEROXO_A:
        return DonorKind.SUPEROXO
    return DonorKind.PEROXO_END_ON if site.side_on_with("O") is None else DonorKind.PEROXO_SIDE_ON


def _oxygen_of_group(site: DonorSite, centre: int) -> DonorKind:
    """Oxygen with one neighbour: carboxylate, oxoanion, alkoxide or a neutral carbonyl."""
    graph = site.graph
    element = graph.symbols[centre]
    oxygens = [k for k in graph.neighbours[centre] if graph.symbols[k] == "O"]
    if element == "C":
        if len(oxygens) == 3:
            return DonorKind.OXOANION
        if len(oxygens) == 2:
            free = all(len(graph.neighbours[k]) == 1 for k in oxygens)
            return DonorKind.CARBOXYLATO if free else DonorKind.ETHER
        sp2 = len(graph.neighbours[centre]) <= 3
        return DonorKind.ETHER if sp2 and site.length_A(centre) < _CARBONYL_OXYGEN_A else DonorKind.ALKOXO
    if len(oxygens) >= 2 and (element == "N" or element in _OXOANION_CENTRES):
        return DonorKind.OXOANION
    return DonorKind.ALKOXO if element == "Si" else DonorKind.OTHER


def _nitrogen(site: DonorSite) -> DonorKind:
    count = len(site.others)
    if count == 0:
        if site.bridging:
            return DonorKind.BRIDGING_NITRIDO
        # A long bond to a bare N is an ammine or amide whose hydrogens the file lacks, no nitride.
        return DonorKind.NITROGEN if site.weaker_than(HYDROXO_VALENCE) else DonorKind.NITRIDO
    if count == 1:
        return _nitrogen_with_one(site, site.others[0])
    if count == 2:
        return _nitrogen_with_two(site)
    return DonorKind.AMINE if count == 3 else DonorKind.NITROGEN


def _nitrogen_with_one(site: DonorSite, other: int) -> DonorKind:
    graph = site.graph
    element = graph.symbols[other]
    linear = site.angle_deg(other) >= LINEAR_DEG
    beyond = [k for k in graph.neighbours[other] if k != site.atom]
    if element == "O" and not beyond:
        return DonorKind.NITROSYL_LINEAR if linear else DonorKind.NITROSYL_BENT
    if element == "C" and site.length_A(other) < _TRIPLE_CN_A:
        if not beyond:
            return DonorKind.CYANIDO
        organic = len(beyond) == 1 and graph.symbols[beyond[0]] in ("C", "H")
        return DonorKind.NITRILE if organic else DonorKind.NITROGEN
    unsaturated = element == "C" and len(beyond) == 2 and site.length_A(other) < _IMINE_CN_A - 0.04
    if element in ("N", "O") or site.bridging or unsaturated or site.weaker_than(HYDROXO_VALENCE):
        return DonorKind.NITROGEN
    return DonorKind.IMIDO_LINEAR if linear else DonorKind.IMIDO_BENT


def _nitrogen_with_two(site: DonorSite) -> DonorKind:
    """Amido, unless the nitrogen belongs to an imine, an azine or a macrocycle or lost its hydrogen."""
    graph = site.graph
    sp2 = [
        site.length_A(k)
        for k in site.others
        if graph.symbols[k] == "C" and len(graph.neighbours[k]) == 3 and _planar(graph, k)
    ]
    limit = _ARYLAMIDE_CN_A if len(sp2) == 2 else _IMINE_CN_A
    delocalised = bool(sp2) and min(sp2) < limit
    hetero = {"O", "N"}.intersection(site.symbols)
    if delocalised or hetero or site.weaker_than(0.5):
        return DonorKind.NITROGEN
    return DonorKind.AMIDO


def _planar(graph: BondGraph, atom: int) -> bool:
    a, b, c = graph.neighbours[atom]
    total = graph.angle_deg(a, atom, b) + graph.angle_deg(b, atom, c) + graph.angle_deg(a, atom, c)
    return total > 350.0


def _carbon(site: DonorSite) -> DonorKind:
    if site.side_on_with("C") is not None:
        return DonorKind.SIDE_ON_CARBON
    count = len(site.others)
    if count == 1:
        return _carbon_with_one(site, site.others[0])
    if count == 2:
        return _carbon_with_two(site)
    return DonorKind.ALKYL if count == 3 else DonorKind.OTHER


def _carbon_with_one(site: DonorSite, other: int) -> DonorKind:
    graph = site.graph
    element, length = graph.symbols[other], site.length_A(other)
    terminal = len(graph.neighbours[other]) == 1
    if element == "O" and terminal:
        return DonorKind.CARBONYL
    if element == "N":
        return DonorKind.CYANIDO if terminal else DonorKind.OTHER
    if element not in ("C", "H", "Si", "Ge"):
        return DonorKind.OTHER
    if site.angle_deg(other) >= LINEAR_DEG:
        # C=C within the ligand leaves an alkynyl or vinylidene group.
        return DonorKind.ALKYL if element == "C" and length < 1.36 else DonorKind.CARBYNE
    return DonorKind.CARBENE if _short(site) else DonorKind.ALKYL


def _carbon_with_two(site: DonorSite) -> DonorKind:
    """Carbene, unless a multiple bond inside the ligand makes it an aryl, vinyl or acyl group."""
    graph = site.graph
    elements = dict(zip(site.others, site.symbols, strict=True))
    if any(e == "C" and site.length_A(k) < _MULTIPLE_CC_A for k, e in elements.items()):
        return DonorKind.ALKYL
    if any(e == "O" and len(graph.neighbours[k]) == 1 for k, e in elements.items()):
        return DonorKind.ALKYL
    if {"N", "O", "S", "P"}.intersection(site.symbols):
        return DonorKind.CARBENE
    return DonorKind.CARBENE if _short(site) else DonorKind.ALKYL


def _short(site: DonorSite) -> bool:
    graph = site.graph
    radii = covalent_radius_A(graph.symbols[site.metal]) + covalent_radius_A("C")
    return graph.distance_A(site.metal, site.atom) < ALKYLIDENE_FRACTION * radii


def _sulfur(site: DonorSite) -> DonorKind:
    if not site.others:
        return DonorKind.BRIDGING_SULFIDO if site.bridging else DonorKind.SULFIDO
    if len(site.others) == 1 and site.symbols[0] in ("C", "H", "Si", "P"):
        return DonorKind.THIOLATO
    return DonorKind.OTHER
