"""Tables of a store as Parquet."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

from ehmo.errors import InputError
from ehmo.report.export.selection import Exported, Selection
from ehmo.report.export.tables import facts, selected_cells
from ehmo.store import Store
from ehmo.store.writing import groups

ROW_GROUP = 20_000
"""Rows of one group of the file, held in memory together."""


def write_parquet(store: Store, selection: Selection, target: Path) -> Exported:
    """Table as Parquet, with types, units and meanings of the columns in its schema."""
    try:
        import pyarrow
        from pyarrow import parquet
    except ImportError:
        raise InputError(
            "pyarrow is not installed", place="--to", mend="pip install 'ehmo[tables]', or export to .csv"
        ) from None
    schema = _schema(pyarrow, store, selection)
    count = 0
    with target.open("wb") as file, parquet.ParquetWriter(file, schema, compression="zstd") as writer:
        for rows in groups(selected_cells(store, selection), ROW_GROUP):
            columns = zip(zip(*rows, strict=True), schema, strict=True)
            arrays = [pyarrow.array(cells, type=field.type) for cells, field in columns]
            writer.write_batch(pyarrow.record_batch(arrays, schema=schema))
            count += len(rows)
    return Exported(count)


def _schema(pyarrow: Any, store: Store, selection: Selection) -> Any:
    types = {"text": pyarrow.string(), "integer": pyarrow.int64(), "real": pyarrow.float64()}
    fields = [
        pyarrow.field(column.name, types[column.kind], metadata={"unit": column.unit, "meaning": column.meaning})
        for column in selection.columns
    ]
    return pyarrow.schema(fields, metadata={"ehmo": json.dumps(facts(store, selection))})
