"""What a comparison says of each bond, by limits that the reference species justify.

The limits rest on 22 oxo, nitrido and dioxo ions (94 metal-donor bonds) in PBE and the minimal basis, against the
standard set with self-consistent charges; tests hold them against the typed-in values.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

from ehmo.conventions import BOND_SYMMETRIES
from ehmo.records.bonding import BondChannel
from ehmo.records.crosscheck import (
    AtomNumbers,
    BondNumbers,
    LadderComparison,
    LadderStep,
    ReferenceRun,
    Verdict,
    VerdictKind,
)

MAYER_AGREES: Final = 0.25
"""Twice the mean difference of the reference bonds (0.12); nine in ten of them lie within it."""

MAYER_DOUBTFUL: Final = 0.50
"""Nearly twice the largest difference of a reference bond (0.28): such a difference has another cause."""

CHANNEL_AGREES: Final = 0.25
"""Sums of the sigma, of the pi and of the delta weights; the reference bonds stay below 0.23."""

LEVELS_CLEAR_EV: Final = 0.25
"""Minimal bases differ among themselves by as much in the order of d levels (b1 and e of VOCl4 2-) [eV]."""

CONTAMINATION: Final = 0.10
"""Excess of <S2>; the reference species stay below 0.04."""

SPIN_AGREES: Final = 0.50
"""Unpaired electrons on the metal [e]; more than that apart is another distribution of them."""

ELECTRONS_AGREE: Final = 0.75
"""Electrons in the levels of one irrep; more than that apart is another configuration, and no even sharing."""


def verdict(
    ours: BondNumbers,
    reference: BondNumbers,
    run: ReferenceRun,
    metal: tuple[AtomNumbers, AtomNumbers],
    unpaired_electrons: int,
    ladder: LadderComparison,
) -> Verdict:
    """Verdict on one bond.

    Parameters
    ----------
    ours, reference : BondNumbers
    run : ReferenceRun
    metal : tuple of AtomNumbers
        The bond's metal on both sides.
    unpaired_electrons : int
        Of the fragment.
    ladder : LadderComparison
        Of the bond's metal.

    Returns
    -------
    verdict : Verdict
        "doubtful" if the run or the comparison is not to be trusted; else by the difference of Mayer orders.
    """
    difference = ours.mayer - reference.mayer
    doubts = [
        *run.doubts,
        *_spin_doubts(run, metal, unpaired_electrons),
        *_configuration_doubts(ladder),
        *_size_doubts(difference),
    ]
    remarks = [
        f"Mayer {ours.mayer:.2f} against {reference.mayer:.2f}, {_within(difference)}",
        *_channel_remarks(ours.channels, reference.channels),
    ]
    kind: VerdictKind = "agrees"
    words = "agrees"
    if doubts:
        kind, words = "doubtful", f"doubtful because {doubts[0]}"
    elif abs(difference) > MAYER_AGREES:
        kind = "higher" if difference > 0 else "lower"
        words = f"ehmo {kind} by {abs(difference):.2f}"
    return Verdict(kind, difference, words, (*doubts, *remarks))


def swapped_levels(
    ours: Sequence[LadderStep], reference: Sequence[LadderStep], degeneracies: dict[str, int]
) -> tuple[tuple[str, str], ...]:
    """Pairs of levels that both sides order clearly and oppositely.

    Parameters
    ----------
    ours, reference : sequence of LadderStep
        By rising energy.
    degeneracies : dict of str to int
        Dimension of each irrep; 1 where not named.

    Returns
    -------
    swapped : tuple of (str, str)
        The lower of the two in `ours` first.
    """
    mine, theirs = _level_energies(ours, degeneracies), _level_energies(reference, degeneracies)
    shared = [name for name in mine if name in theirs]
    return tuple(
        (lower[0], upper[0])
        for lower in shared
        for upper in shared
        if mine[upper] - mine[lower] > LEVELS_CLEAR_EV and theirs[lower] - theirs[upper] > LEVELS_CLEAR_EV
    )


def _level_energies(steps: Sequence[LadderStep], degeneracies: dict[str, int]) -> dict[tuple[str, int], float]:
    """Mean energy of each level by label and by place among the levels of that label."""
    energies: dict[tuple[str, int], list[float]] = {}
    seen: dict[str, int] = {}
    for step in steps:
        place = seen.get(step.label, 0)
        seen[step.label] = place + 1
        energies.setdefault((step.label, place // degeneracies.get(step.label, 1)), []).append(step.above_lowest_eV)
    return {name: sum(values) / len(values) for name, values in energies.items()}


def _within(difference: float) -> str:
    if abs(difference) <= MAYER_AGREES:
        return f"within {MAYER_AGREES:g}"
    return f"{abs(difference):.2f} {'higher' if difference > 0 else 'lower'}"


def _size_doubts(difference: float) -> list[str]:
    if abs(difference) <= MAYER_DOUBTFUL:
        return []
    return [f"the Mayer orders differ by {abs(difference):.2f}, more than in any reference species"]


def _spin_doubts(run: ReferenceRun, metal: tuple[AtomNumbers, AtomNumbers], unpaired: int) -> list[str]:
    said = []
    excess = run.spin_squared - unpaired / 2 * (unpaired / 2 + 1)
    if excess > CONTAMINATION:
        said.append(f"the spin of the run is contaminated (<S2> {run.spin_squared:.2f}, {excess:.2f} too much)")
    if abs(metal[0].spin - metal[1].spin) > SPIN_AGREES:
        said.append(f"the metal has {metal[0].spin:.2f} unpaired electrons against {metal[1].spin:.2f} in the run")
    return said


def _configuration_doubts(ladder: LadderComparison) -> list[str]:
    if not ladder.ours or not ladder.reference:
        return []
    pools = _pools(ladder.ours)
    ours, reference = _electrons(ladder.ours, pools), _electrons(ladder.reference, pools)
    labels = dict.fromkeys([*ours, *reference])
    if all(abs(ours.get(label, 0.0) - reference.get(label, 0.0)) <= ELECTRONS_AGREE for label in labels):
        return []
    return [f"the {ladder.shell} levels are filled differently: {_filling(ours)} against {_filling(reference)}"]


def _pools(steps: Sequence[LadderStep]) -> dict[str, str]:
    """Irreps that share electrons by chance: levels too close to be told apart, joined under one name."""
    groups: list[list[str]] = []
    for place, step in enumerate(steps):
        close = place > 0 and step.above_lowest_eV - steps[place - 1].above_lowest_eV <= LEVELS_CLEAR_EV
        if close:
            groups[-1].append(step.label)
        else:
            groups.append([step.label])
    pools: dict[str, str] = {}
    for group in groups:
        name = "/".join(dict.fromkeys(group))
        pools |= {label: pools.get(label, name) for label in group}
    return pools


def _electrons(steps: Sequence[LadderStep], pools: dict[str, str]) -> dict[str, float]:
    held: dict[str, float] = {}
    for step in steps:
        name = pools.get(step.label, step.label)
        held[name] = held.get(name, 0.0) + step.electrons
    return held


def _filling(held: dict[str, float]) -> str:
    return " ".join(f"{label} {electrons:.1f}" for label, electrons in held.items() if electrons > 0.05) or "empty"


def _channel_remarks(ours: Sequence[BondChannel], reference: Sequence[BondChannel]) -> list[str]:
    parts, apart = [], False
    for symmetry in BOND_SYMMETRIES:
        mine, theirs = _sum(ours, symmetry), _sum(reference, symmetry)
        if max(mine, theirs) >= CHANNEL_AGREES / 2:
            parts.append(f"{symmetry} {mine:.2f} against {theirs:.2f}")
            apart |= abs(mine - theirs) > CHANNEL_AGREES
    if not parts:
        return []
    return [f"channel weights {', '.join(parts)}" + (f", more than {CHANNEL_AGREES:g} apart" if apart else "")]


def _sum(channels: Sequence[BondChannel], symmetry: str) -> float:
    return sum(channel.weight for channel in channels if channel.type == symmetry)
