"""The report: a folder that opens from disk. It shows results, and computes none."""

from streamhost.report.contents import Contents, Lane, Section, Sound, Table
from streamhost.report.page import page
from streamhost.report.writing import AUDIO, DOCUMENTS, FIGURES, INDEX, check_report, report_folder

__all__ = [
    "AUDIO", "DOCUMENTS", "FIGURES", "INDEX", "Contents", "Lane", "Section", "Sound", "Table", "check_report", "page",
    "report_folder",
]
