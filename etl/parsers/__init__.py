"""From a log to canonical fixations: one module a kind of log."""

from etl.parsers.canonical import CanonicalLog
from etl.parsers.eyes import EyeChoice
from etl.parsers.readers import LogReader, counted_file, is_log, reader_for
from etl.parsers.table_log import TableReader

__all__ = [
    "CanonicalLog",
    "EyeChoice",
    "LogReader",
    "TableReader",
    "counted_file",
    "is_log",
    "reader_for",
]
