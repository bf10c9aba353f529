"""Texts of small CIFs."""

from __future__ import annotations

from collections.abc import Sequence

CUBE = (9.0, 9.0, 9.0, 90.0, 90.0, 90.0)
INVERSION = ("x,y,z", "-x,-y,-z")


def cif(
    sites: Sequence[str],
    *,
    cell: Sequence[float] = CUBE,
    operations: Sequence[str] = ("x,y,z",),
    columns: str = "",
    extra: str = "",
    name: str = "test",
) -> str:
    """CIF whose sites are lines ``label type x y z ...`` with further columns named in `columns`."""
    tags = ("length_a", "length_b", "length_c", "angle_alpha", "angle_beta", "angle_gamma")
    head = [f"_cell_{tag} {value}" for tag, value in zip(tags, cell, strict=True)]
    loop = ["label", "type_symbol", "fract_x", "fract_y", "fract_z", *columns.split()]
    return "\n".join(
        [
            f"data_{name}",
            *head,
            *extra.splitlines(),
            "loop_",
            "_space_group_symop_operation_xyz",
            *(f"'{operation}'" for operation in operations),
            "loop_",
            *(f"_atom_site_{tag}" for tag in loop),
            *sites,
            "",
        ]
    )


def tetraoxo(
    metal: str = "Cr", centre: Sequence[float] = (0.1, 0.1, 0.1), step: float = 0.1053, edge: float = 9.0
) -> list[str]:
    """Tetrahedral ion, metal-oxygen step x edge x sqrt(3), 1.64 A by default."""
    x, y, z = centre
    d = step * 9.0 / edge
    corners = ((1, 1, 1), (-1, -1, 1), (-1, 1, -1), (1, -1, -1))
    return [
        f"{metal}1 {metal} {x} {y} {z}",
        *(f"O{k} O {x + a * d:.5f} {y + b * d:.5f} {z + c * d:.5f}" for k, (a, b, c) in enumerate(corners, start=1)),
    ]


def with_occupancy(sites: Sequence[str], occupancy: float = 1.0) -> list[str]:
    """Sites with one occupancy for all."""
    return [f"{site} {occupancy}" for site in sites]
