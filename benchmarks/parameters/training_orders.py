"""Mayer orders and charges of molecules for a calibration, from PySCF: PBE in a minimal basis.

    python benchmarks/parameters/training_orders.py FILE.xyz [TITLE ...] >> rows.csv

One row per distinct bond of the metal and one for its charge, in the form of a table of observables. The run is that of
`ehmo crosscheck`: minimal contraction of ANO-RCC, spin-free one-electron X2C, density fitting; it is kept in the cache.
Titles after the file restrict it.
"""

from __future__ import annotations

import csv
import sys

from ehmo import bond_report
from ehmo.structure import read_frames
from ehmo.studies.crosscheck import crosscheck, default_cache

SAME_ORDER = 5e-3
"""Bonds of one kind whose orders differ by less count once."""


def main(path: str, titles: list[str]) -> None:
    writer = csv.writer(sys.stdout, lineterminator="\n")
    for fragment in read_frames(path):
        if titles and fragment.title not in titles:
            continue
        report = bond_report(fragment, "standard")  # for its bonds alone
        compared = crosscheck(report, cache=default_cache())
        seen: list[tuple[str, float]] = []
        source = f"PBE, ANO-RCC minimal, X2C; {compared.run.program}"
        if compared.run.doubts:
            print(f"{fragment.title}: {'; '.join(compared.run.doubts)}", file=sys.stderr)
        for pair in compared.bonds:
            bond, order = pair.bond, pair.reference.mayer
            if any(kind == bond.kind and abs(order - other) < SAME_ORDER for kind, other in seen):
                continue
            seen.append((bond.kind, order))
            writer.writerow([fragment.title, "Mayer order", report.bond_label(bond), f"{order:.3f}", source])
        for metal in report.coordination.metals:
            charge = compared.atoms[metal][1].charge
            writer.writerow([fragment.title, "charge", report.fragment.labels[metal], f"{charge:.3f}", source])
        sys.stdout.flush()


if __name__ == "__main__":
    main(sys.argv[1], sys.argv[2:])
