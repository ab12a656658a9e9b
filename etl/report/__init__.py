"""The audit page: what a build took in, what it left out, and which readers stand out."""

from typing import TYPE_CHECKING

from etl.lazily import loader

if TYPE_CHECKING:
    from etl.report.audit import AUDIT, write_audit
    from etl.report.inputs import AccountRow, AuditInput, GalleryEntry, NotRecorded, UnsureTrial
    from etl.report.kept_rows import LineGrid
    from etl.report.line_trust import LineTally, LineTrust
    from etl.report.logs import LogFate, LogMatter, LogsTold
    from etl.report.reader_profile import (
        Profiles,
        ReaderProfile,
        TrialFates,
        profile_of,
        profiles_of,
    )

__all__ = [
    "AUDIT",
    "AccountRow",
    "AuditInput",
    "GalleryEntry",
    "LineGrid",
    "LineTally",
    "LineTrust",
    "LogFate",
    "LogMatter",
    "LogsTold",
    "NotRecorded",
    "Profiles",
    "ReaderProfile",
    "TrialFates",
    "UnsureTrial",
    "profile_of",
    "profiles_of",
    "write_audit",
]

_HOMES = {
    **dict.fromkeys(
        (
            "AUDIT",
            "write_audit",
        ),
        "etl.report.audit",
    ),
    **dict.fromkeys(
        (
            "AccountRow",
            "AuditInput",
            "GalleryEntry",
            "NotRecorded",
            "UnsureTrial",
        ),
        "etl.report.inputs",
    ),
    **dict.fromkeys(("LineGrid",), "etl.report.kept_rows"),
    **dict.fromkeys(
        (
            "LineTally",
            "LineTrust",
        ),
        "etl.report.line_trust",
    ),
    **dict.fromkeys(
        (
            "LogFate",
            "LogMatter",
            "LogsTold",
        ),
        "etl.report.logs",
    ),
    **dict.fromkeys(
        (
            "Profiles",
            "ReaderProfile",
            "TrialFates",
            "profile_of",
            "profiles_of",
        ),
        "etl.report.reader_profile",
    ),
}
__getattr__ = loader(__name__, _HOMES)
