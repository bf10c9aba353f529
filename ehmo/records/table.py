"""Plain-text tables with aligned columns."""

from __future__ import annotations

from collections.abc import Sequence


def aligned(rows: Sequence[Sequence[str]], numeric: Sequence[int] = (), *, indent: str = "") -> list[str]:
    """Lines of a table whose columns line up.

    Parameters
    ----------
    rows : sequence of sequence of str
        Cells, the heading first; all rows have the same length.
    numeric : sequence of int
        Columns aligned to the right.
    indent : str
        Put before each line.

    Returns
    -------
    lines : list of str
    """
    widths = [max(len(row[k]) for row in rows) for k in range(len(rows[0]))]
    return [
        (
            indent
            + "  ".join(
                cell.rjust(width) if k in numeric else cell.ljust(width)
                for k, (cell, width) in enumerate(zip(row, widths, strict=True))
            )
        ).rstrip()
        for row in rows
    ]
