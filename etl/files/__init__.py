"""Files as labs have them, turned into text cells that remember their line."""

from etl.files.coded import Coded, group_rows, marks_of, place_rows
from etl.files.decoding import RawText, read_text
from etl.files.delimited import Cells, cells_of, header_of, read_cells
from etl.files.numeric_cells import NumberReading, find_decimal, number_of, numbers_in
from etl.files.table_files import file_and_sheet, header_of_table, read_table
from etl.files.tally import FileAccount, Tally
from etl.files.truths import truth_of

__all__ = [
    "Cells",
    "Coded",
    "FileAccount",
    "NumberReading",
    "RawText",
    "Tally",
    "cells_of",
    "file_and_sheet",
    "find_decimal",
    "group_rows",
    "header_of",
    "header_of_table",
    "marks_of",
    "number_of",
    "numbers_in",
    "place_rows",
    "read_cells",
    "read_table",
    "read_text",
    "truth_of",
]
