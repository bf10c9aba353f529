"""Numerical health of a calculation, and what a report says where it matters."""

from __future__ import annotations

from ehmo.analysis.health import numerical_health
from ehmo.calculate.numbers import Bonding
from ehmo.records.coordination import Coordination
from ehmo.records.fragment import Fragment
from ehmo.records.health import Health

SMALL_OVERLAP_EIGENVALUE = 0.01
"""Below this, populations and Mayer orders begin to lose their meaning (common practice)."""

NEGATIVE_SHARE = -0.05
"""Share of the metals in a filled orbital below which mixing counts as counter-intuitive."""

MANY_ITERATIONS = 40
"""More diagonalisations than this are a sign of charges that hardly settle."""


def health_of(coordination: Coordination, bonding: Bonding) -> Health:
    """Health of a calculation."""
    return numerical_health(
        coordination.bonds,
        bonding.plan.basis,
        bonding.state,
        bonding.populations,
        bonding.orders,
        float(bonding.overlap.eigenvalues[0]),
    )


def health_warnings(fragment: Fragment, coordination: Coordination, health: Health) -> tuple[str, ...]:
    """Sentences on signs that the numbers cannot mean what they should; a near-degenerate frontier has its own."""
    labels, said = fragment.labels, []
    if health.smallest_overlap_eigenvalue < SMALL_OVERLAP_EIGENVALUE:
        said.append(
            "the functions are nearly dependent (smallest overlap eigenvalue "
            f"{health.smallest_overlap_eigenvalue:.1e}): trust Wiberg orders and channels before populations"
        )
    said += [
        f"the {item.shell} shell of {labels[item.atom]} has a gross population of {item.population:.2f}: "
        "counter-intuitive mixing; distrust the charges, try a weighted K or tighter exponents"
        for item in health.impossible_populations
    ]
    if health.smallest_metal_share < NEGATIVE_SHARE:
        said.append(
            f"a filled orbital has a metal share of {100 * health.smallest_metal_share:.0f} %: counter-intuitive mixing"
        )
    for place in health.negative_bonds:
        bond = coordination.bonds[place]
        said.append(
            f"the overlap population of {labels[bond.metal]}-{labels[bond.donor]} is negative although it counts as "
            "a bond: look at its length, or distrust populations here"
        )
    if health.iterations > MANY_ITERATIONS:
        said.append(f"the charges settled only after {health.iterations} iterations: another solution may be near")
    return tuple(said)
