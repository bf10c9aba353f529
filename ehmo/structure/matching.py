"""Maximum matching in a general graph: which unsaturated neighbours pair up to multiple bonds."""

from __future__ import annotations

from collections import deque
from collections.abc import Mapping, Sequence

FREE = -1


def maximum_matching(neighbours: Sequence[Sequence[int]]) -> list[int]:
    """Partner of each vertex in a matching of the largest size, -1 where unmatched.

    Augmenting paths with contraction of odd cycles: odd rings such as cyclopentadienyl rule out the simpler
    bipartite methods.

    Parameters
    ----------
    neighbours : sequence of sequence of int
        Adjacency lists of an undirected graph.

    Returns
    -------
    partner : list of int

    References
    ----------
    .. [1] edmonds-1965: J. Edmonds, Can. J. Math. 17, 449 (1965).
    """
    partner = [FREE] * len(neighbours)
    for vertex, near in enumerate(neighbours):
        if partner[vertex] == FREE:
            free = next((other for other in near if partner[other] == FREE and other != vertex), None)
            if free is not None:
                partner[vertex], partner[free] = free, vertex
    for root in range(len(neighbours)):
        if partner[root] == FREE:
            _augment(root, neighbours, partner)
    return partner


def _augment(root: int, neighbours: Sequence[Sequence[int]], partner: list[int]) -> None:
    size = len(neighbours)
    parent = [FREE] * size
    base = list(range(size))
    in_tree = [vertex == root for vertex in range(size)]
    queue = deque([root])
    while queue:
        vertex = queue.popleft()
        for other in neighbours[vertex]:
            if base[vertex] == base[other] or partner[vertex] == other:
                continue
            if other == root or (partner[other] != FREE and parent[partner[other]] != FREE):
                queue.extend(_contract(vertex, other, base, parent, partner, in_tree))
            elif parent[other] == FREE:
                parent[other] = vertex
                if partner[other] == FREE:
                    _flip(other, parent, partner)
                    return
                in_tree[partner[other]] = True
                queue.append(partner[other])


def _contract(
    one: int, two: int, base: list[int], parent: list[int], partner: list[int], in_tree: list[bool]
) -> list[int]:
    """Make one vertex of the odd cycle closed by an edge; returns the vertices that thereby join the tree."""
    stem = _common_base(one, two, base, parent, partner)
    cycle = [False] * len(base)
    for start, child in ((one, two), (two, one)):
        vertex = start
        while base[vertex] != stem:
            cycle[base[vertex]] = cycle[base[partner[vertex]]] = True
            parent[vertex] = child
            child = partner[vertex]
            vertex = parent[partner[vertex]]
    joined = []
    for vertex in range(len(base)):
        if cycle[base[vertex]]:
            base[vertex] = stem
            if not in_tree[vertex]:
                in_tree[vertex] = True
                joined.append(vertex)
    return joined


def _common_base(one: int, two: int, base: list[int], parent: list[int], partner: list[int]) -> int:
    seen = set()
    vertex = one
    while True:
        vertex = base[vertex]
        seen.add(vertex)
        if partner[vertex] == FREE:
            break
        vertex = parent[partner[vertex]]
    vertex = two
    while base[vertex] not in seen:
        vertex = parent[partner[base[vertex]]]
    return base[vertex]


def _flip(end: int, parent: list[int], partner: list[int]) -> None:
    while end != FREE:
        before = parent[end]
        after = partner[before]
        partner[end], partner[before] = before, end
        end = after


def unsatisfied(deficits: Mapping[int, int], neighbours: Mapping[int, Sequence[int]]) -> dict[int, int]:
    """Valences left open when neighbouring atoms form as many multiple bonds as they can.

    Parameters
    ----------
    deficits : mapping of int to int
        Open valences of each atom.
    neighbours : mapping of int to sequence of int
        Bonded atoms of each atom.

    Returns
    -------
    open : dict of int to int
        Atoms with valences left and their number; where equally good pairings exist it is one of them.
    """
    copies = [(atom, k) for atom in sorted(deficits) for k in range(deficits[atom])]
    number = {copy: index for index, copy in enumerate(copies)}
    adjacency = [
        [number[other, k] for other in neighbours[atom] for k in range(deficits.get(other, 0))] for atom, _ in copies
    ]
    partner = maximum_matching(adjacency)
    left: dict[int, int] = {}
    for (atom, _), mate in zip(copies, partner, strict=True):
        if mate == FREE:
            left[atom] = left.get(atom, 0) + 1
    return left
