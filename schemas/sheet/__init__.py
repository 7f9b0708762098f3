"""A system or a question as a spreadsheet's used range (contract, section 2).

A row whose first cell is `[bodies]` or the like opens a block; the next row is its header, then one
row per item. What a column may hold follows from the models of the contract: a new field of theirs
is a new column here.
"""

from schemas.sheet.reading import Sheet, read_sheet
from schemas.sheet.writing import write_question, write_sheet

MEDIA_TYPES = ("text/csv", "text/tab-separated-values")

__all__ = ["MEDIA_TYPES", "Sheet", "read_sheet", "write_question", "write_sheet"]
