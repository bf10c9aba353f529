"""Counts, failures and distributions of a store."""

from __future__ import annotations

import re
from collections.abc import Iterable

from ehmo.records.store_summary import Calculation, FailureReason, StoreSummary
from ehmo.store.distributions import bond_statistics
from ehmo.store.records import DONE, FAILED
from ehmo.store.store import Store
from ehmo.store.where import Condition

MOST_REASONS = 1000
"""Reasons told apart; messages that all differ must not fill the memory."""

_STATUS, _ROWS, _DOUBTED, _FIRST, _LAST, _SECONDS = range(4, 10)
"""Columns of `reading.made_by`."""

_NUMBER = re.compile(r"(?<![\w.])[+-]?\d+(?:\.\d+)?(?:[eE][+-]?\d+)?|\d+")


def summarise(store: Store, where: Condition | None = None) -> StoreSummary:
    """Counts, failures by reason, distributions by metal and kind, and outliers.

    Parameters
    ----------
    store : Store
    where : Condition, optional
        Only structures and bonds that meet it.

    Returns
    -------
    summary : StoreSummary
    """
    made = store.made_by(where)
    calculations: dict[tuple[str, str, str, int], int] = {}
    for set_, hash_, version, edition, _, rows, *_ in made:
        by = (str(set_), str(hash_), str(version), int(edition or 0))
        calculations[by] = calculations.get(by, 0) + int(rows)
    reasons = _Reasons()
    for source, entry, message in store.failures(where):
        reasons.add(str(source), str(entry), str(message))
    bonds = bond_statistics(store, where)
    return StoreSummary(
        store=store.name,
        where=None if where is None else where.text,
        done=sum(int(row[_ROWS]) for row in made if row[_STATUS] == DONE),
        failed=sum(int(row[_ROWS]) for row in made if row[_STATUS] == FAILED),
        doubted=sum(int(row[_DOUBTED]) for row in made if row[_STATUS] == DONE),
        first_started_utc=min((str(row[_FIRST]) for row in made), default=""),
        last_started_utc=max((str(row[_LAST]) for row in made), default=""),
        duration_s=float(sum(row[_SECONDS] or 0.0 for row in made)),
        calculations=_most_first(Calculation(*by, rows) for by, rows in calculations.items()),
        reasons=reasons.listed(),
        other_failures=reasons.others,
        kinds=bonds.kinds,
        outliers=bonds.outliers,
        outliers_found=bonds.outliers_found,
    )


def _most_first(calculations: Iterable[Calculation]) -> tuple[Calculation, ...]:
    return tuple(sorted(calculations, key=lambda made: -made.rows))


def reason_of(message: str, source: str) -> str:
    """Reason in a message without its place and mend, numbers replaced.

    Parameters
    ----------
    message : str
        Such as ``a.xyz, line 4: 12 of 13 atoms; complete the file``.
    source : str
        Source of the row.

    Returns
    -------
    reason : str

    Examples
    --------
    >>> reason_of("a.xyz, line 4: 12 of 13 atoms; complete the file", "a.xyz")
    '# of # atoms'
    """
    text = message
    if source and text.startswith(source):
        _, separator, after = text[len(source) :].partition(": ")
        text = after if separator else text
    return _NUMBER.sub("#", text.partition("; ")[0])


class _Reasons:
    """Failures by reason, with the first of each."""

    def __init__(self) -> None:
        self._found: dict[str, FailureReason] = {}
        self._counts: dict[str, int] = {}
        self.others = 0

    def add(self, source: str, entry: str, message: str) -> None:
        reason = reason_of(message, source)
        if reason not in self._found:
            if len(self._found) >= MOST_REASONS:
                self.others += 1
                return
            self._found[reason] = FailureReason(reason, 0, source, entry, message)
        self._counts[reason] = self._counts.get(reason, 0) + 1

    def listed(self) -> tuple[FailureReason, ...]:
        """Reasons, most frequent first."""
        ordered = sorted(self._counts, key=lambda reason: -self._counts[reason])
        return tuple(
            FailureReason(reason, self._counts[reason], one.source, one.entry, one.message)
            for reason, one in ((reason, self._found[reason]) for reason in ordered)
        )
