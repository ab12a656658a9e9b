"""From a log to canonical fixations: one module a kind of log."""

from etl.parsers.canonical import CanonicalLog
from etl.parsers.table_log import LogReader

__all__ = ["CanonicalLog", "LogReader"]
