"""The instrument `table`: a preset with its knobs at all their positions, and turned from each to the next."""

from streamhost.measure.settings.result import Setting, Table, Turn
from streamhost.measure.settings.table_run import table

__all__ = ["Setting", "Table", "Turn", "table"]
