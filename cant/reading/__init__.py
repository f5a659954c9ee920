"""Understanding tables: from cells to curves, traffic, limits and settings, with every doubt kept.

:func:`read_workbook` and :func:`read_frames` are the two doors; :func:`reading_document` and
:func:`reading_table` show a person how a file was understood.
"""

from cant.reading.answers import read_answers
from cant.reading.document import reading_document, reading_table
from cant.reading.frames import read_frames, sheet_from_frame
from cant.reading.workbook import read_tables, read_workbook

__all__ = [
    "read_answers",
    "read_frames",
    "read_tables",
    "read_workbook",
    "reading_document",
    "reading_table",
    "sheet_from_frame",
]
