"""Metal by metal: symmetry of the sphere, ladder, ligand-field parameters, formal bond orders."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from ehmo.analysis.angular_overlap import angular_overlap, crystal_field_parameters
from ehmo.analysis.formal_order import formal_orders
from ehmo.analysis.ladder import LadderError, ladders
from ehmo.analysis.pi_planes import pi_normals
from ehmo.analysis.symmetry import find_symmetry, shape_measures
from ehmo.analysis.symmetry.parts import shell_part_irreps, shell_parts
from ehmo.calculate.numbers import Bonding
from ehmo.conventions import ELEMENT_SYMBOLS
from ehmo.harmonics import harmonic_rotations
from ehmo.records.arrays import FloatArray
from ehmo.records.coordination import Coordination, ElectronAssignment, LocalFrame
from ehmo.records.formal_order import FormalOrder
from ehmo.records.fragment import Fragment
from ehmo.records.ligand_field import Ladder, LigandFieldParameters
from ehmo.records.site import MetalSite
from ehmo.records.symmetry import Symmetry
from ehmo.structure.elements import ACTINIDES
from ehmo.structure.oxidation import bond_valence_sum, oxidation_guess

MOST_ATOMS = 120
"""Largest fragment whose whole symmetry is searched."""


CUBIC = ("Oh", "Td")
"""Groups whose levels are named after the functions in the group's axes: no single bond sets the axes there."""


def sphere_symmetries(fragment: Fragment, coordination: Coordination) -> tuple[Symmetry, ...]:
    """Idealised symmetry of each metal with its donors.

    Parameters
    ----------
    fragment : Fragment
    coordination : Coordination

    Returns
    -------
    symmetries : tuple of Symmetry
        In the order of the metals; axes as near the local frames as the groups allow.
    """
    symmetries = []
    for frame in coordination.frames:
        bonds = coordination.bonds_of(frame.metal)
        sorts = {frame.metal: (fragment.symbols[frame.metal], "metal")}
        sorts |= {bond.donor: (fragment.symbols[bond.donor], str(bond.kind)) for bond in bonds}
        numbers = {sort: number for number, sort in enumerate(dict.fromkeys(sorts.values()))}
        kinds = np.full(len(fragment), -1)
        kinds[list(sorts)] = [numbers[sort] for sort in sorts.values()]
        symmetries.append(
            find_symmetry(
                fragment.positions_A,
                kinds,
                atoms=np.array(sorted(sorts)),
                origin=frame.metal,
                preferred_axes=frame.axes,
            )
        )
    return tuple(symmetries)


def molecule_symmetry(fragment: Fragment) -> Symmetry | None:
    """Symmetry of all atoms; None beyond `MOST_ATOMS`, where the search would outlast the calculation."""
    if len(fragment) > MOST_ATOMS:
        return None
    return find_symmetry(fragment.positions_A, [ELEMENT_SYMBOLS.index(symbol) for symbol in fragment.symbols])


def group_axes_in_frame(symmetry: Symmetry, frame: LocalFrame) -> FloatArray:
    """(3, 3) axes of the group as rows, in the local axes of the metal."""
    axes: FloatArray = symmetry.axes @ frame.axes.T
    return axes


def shell_spans(symmetry: Symmetry, frame: LocalFrame, l: int) -> tuple[FloatArray, ...]:
    """Functions of a metal's shell, irrep by irrep of its sphere.

    Parameters
    ----------
    symmetry : Symmetry
        Of the sphere.
    frame : LocalFrame
    l : int
        Angular momentum quantum number of the shell.

    Returns
    -------
    spans : tuple of (2*l + 1, n) ndarray
        Orthonormal columns in the local axes.
    """
    turn = harmonic_rotations(group_axes_in_frame(symmetry, frame).T[None], l)[0]
    return tuple(turn @ part for part in shell_parts(symmetry.group, l))


def metal_sites(
    fragment: Fragment,
    coordination: Coordination,
    electrons: ElectronAssignment,
    bonding: Bonding,
    symmetries: tuple[Symmetry, ...] | None = None,
) -> tuple[MetalSite, ...]:
    """Symmetry, oxidation state and ladder of each metal.

    Parameters
    ----------
    fragment : Fragment
    coordination : Coordination
    electrons : ElectronAssignment
        Charge, oxidation state and d count.
    bonding : Bonding
        Orbitals and overlap populations.
    symmetries : tuple of Symmetry, optional
        Of the spheres, where they are known already; their shapes are then not measured again.

    Returns
    -------
    sites : tuple of MetalSite
    """
    known = symmetries is not None
    symmetries = symmetries or sphere_symmetries(fragment, coordination)
    found, withheld = site_ladders(coordination, electrons, bonding, symmetries)
    sites = []
    for place, (frame, symmetry) in enumerate(zip(coordination.frames, symmetries, strict=True)):
        bonds = coordination.bonds_of(frame.metal)
        state = electrons.metal_oxidation_total if len(coordination.metals) == 1 else None
        ladder = found[place]
        sites.append(
            MetalSite(
                metal=frame.metal,
                symmetry=symmetry,
                shapes=shape_measures(
                    fragment.positions_A[frame.metal], fragment.positions_A[[bond.donor for bond in bonds]]
                )
                if bonds and not known
                else (),
                oxidation_state=state,
                d_count=electrons.d_electrons,
                bond_valence_sum=bond_valence_sum(
                    fragment, coordination, frame.metal, _state_of(fragment, coordination, electrons, frame.metal)
                ),
                ladder=None if ladder is None else _with_irreps(ladder, symmetry, frame),
                ladder_withheld="" if ladder is not None else withheld,
                parameters=None if ladder is None else _parameters(fragment, coordination, frame, symmetry, ladder),
            )
        )
    return tuple(sites)


def _state_of(fragment: Fragment, coordination: Coordination, electrons: ElectronAssignment, metal: int) -> int | None:
    """Oxidation state for the bond-valence parameters: by counting where all metals are alike, else by their bonds."""
    metals, total = coordination.metals, electrons.metal_oxidation_total
    if total is not None and total % len(metals) == 0 and len({fragment.symbols[m] for m in metals}) == 1:
        return total // len(metals)
    return oxidation_guess(fragment, coordination, metal).state


def site_ladders(
    coordination: Coordination,
    electrons: ElectronAssignment,
    bonding: Bonding,
    symmetries: tuple[Symmetry, ...],
) -> tuple[tuple[Ladder | None, ...], str]:
    """Ladder of each metal, None where there is none, and the reason of the first that lacks one."""
    bound = [frame for frame in coordination.frames if coordination.bonds_of(frame.metal)]
    lonely = len(bound) < len(coordination.frames)
    parts: tuple[FloatArray, ...] = ()
    turns = [
        harmonic_rotations(group_axes_in_frame(symmetry, frame).T[None], _shell_momentum(bonding, frame))[0]
        for frame, symmetry in zip(coordination.frames, symmetries, strict=True)
        if coordination.bonds_of(frame.metal)
    ]
    if len(coordination.metals) == 1:
        parts = tuple(turns[0] @ part for part in shell_parts(symmetries[0].group, _shell_momentum(bonding, bound[0])))
    naming = [
        turn if symmetry.group.name in CUBIC else np.eye(len(turn))
        for turn, symmetry in zip(
            turns, (s for s, f in zip(symmetries, coordination.frames, strict=True) if f in bound), strict=True
        )
    ]
    overlap = np.sum([orders.orbital_overlap for orders in bonding.orders], axis=0)
    try:
        found = ladders(
            bound,
            bonding.plan.basis,
            bonding.bonded,
            bonding.state,
            overlap,
            parts=parts,
            naming=naming,
            counted_electrons=electrons.d_electrons,
        )
    except LadderError as error:
        return (None,) * len(coordination.frames), error.fault
    by_metal = {ladder.metal: ladder for ladder in found}
    return tuple(by_metal.get(frame.metal) for frame in coordination.frames), "no donors" if lonely else ""


def _with_irreps(ladder: Ladder, symmetry: Symmetry, frame: LocalFrame) -> Ladder:
    """Ladder whose levels carry the irrep that their functions have at the metal in the group of its sphere."""
    l = ladder.angular_momentum
    turn = harmonic_rotations(group_axes_in_frame(symmetry, frame).T[None], l)[0]
    names = shell_part_irreps(symmetry.group, l)
    shares = np.array(
        [(((turn @ part).T @ ladder.vectors) ** 2).sum(axis=0) for part in shell_parts(symmetry.group, l)]
    )
    levels = tuple(
        replace(level, irrep=names[int(share.argmax())], irrep_share=float(share.max()))
        for level, share in zip(ladder.levels, shares.T, strict=True)
    )
    return replace(ladder, levels=levels)


def _shell_momentum(bonding: Bonding, frame: LocalFrame) -> int:
    """Angular momentum of the shell whose ladder is asked for: f where the metal has f functions."""
    return 3 if 3 in bonding.plan.basis.layouts[frame.metal] else 2


def site_formal_orders(
    fragment: Fragment, coordination: Coordination, sites: tuple[MetalSite, ...]
) -> tuple[FormalOrder | None, ...]:
    """Textbook order of every bond of the fragment, in the order of its bonds."""
    found: list[FormalOrder | None] = []
    for site, frame in zip(sites, coordination.frames, strict=True):
        bonds = coordination.bonds_of(site.metal)
        if not bonds:
            continue
        normals = pi_normals(bonds, coordination, fragment.symbols, fragment.positions_A)
        found += formal_orders(
            bonds,
            _directions(coordination, frame, site.symmetry),
            {place: frame.axes @ normal for place, normal in normals.items()},
            site.ladder,
            with_f=fragment.symbols[site.metal] in ACTINIDES,
        )
    return tuple(found)


def _directions(coordination: Coordination, frame: LocalFrame, symmetry: Symmetry) -> FloatArray:
    """Unit vectors to the donors of the idealised sphere, in the local axes."""
    place = {int(atom): k for k, atom in enumerate(symmetry.atoms)}
    donors = [place[bond.donor] for bond in coordination.bonds_of(frame.metal)]
    vectors = (symmetry.symmetrised_A[donors] - symmetry.origin_A) @ frame.axes.T
    directions: FloatArray = vectors / np.linalg.norm(vectors, axis=1)[:, None]
    return directions


def _parameters(
    fragment: Fragment, coordination: Coordination, frame: LocalFrame, symmetry: Symmetry, ladder: Ladder
) -> LigandFieldParameters:
    bonds = coordination.bonds_of(frame.metal)
    crystal_field: dict[str, float] = {}
    if ladder.angular_momentum == 2:
        turn = harmonic_rotations(group_axes_in_frame(symmetry, frame).T[None], 2)[0]
        crystal_field = crystal_field_parameters(turn.T @ ladder.field_eV @ turn, symmetry.group.name)
    vectors = (fragment.positions_A[[bond.donor for bond in bonds]] - fragment.positions_A[frame.metal]) @ frame.axes.T
    directions = vectors / np.linalg.norm(vectors, axis=1)[:, None]
    return angular_overlap(ladder, directions, [bond.kind for bond in bonds], crystal_field)
