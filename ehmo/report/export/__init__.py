"""A store as files for other programs: tables, records, structures. Rows are streamed, so that memory stays flat."""

from ehmo.report.export.formats import FORMATS, export_format
from ehmo.report.export.selection import Exported, Selection, chosen_columns

__all__ = ["FORMATS", "Exported", "Selection", "chosen_columns", "export_format"]
