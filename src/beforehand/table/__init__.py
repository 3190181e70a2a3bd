"""Files to typed columns under the plan's contract, in an order that does not depend on the file's."""

from beforehand.table.columns import Column, Stage, Table, ranks_of
from beforehand.table.reading import read_table, table_from_frame

__all__ = ["Column", "Stage", "Table", "ranks_of", "read_table", "table_from_frame"]
