"""What is handed over to the statistician: codebook, data package, table of regions, bundle."""

from etl.handoff.bundle import write_bundle
from etl.handoff.codebook import write_codebook
from etl.handoff.codebook_study import Rule, StudyFacts
from etl.handoff.codebook_tables import names_in_use
from etl.handoff.data_package import DATA_PACKAGE, write_data_package
from etl.handoff.regions_table import (
    RegionRow,
    region_columns,
    region_key_columns,
    write_regions,
)
from etl.handoff.scripts import READ_TABLES, BundleFacts

__all__ = [
    "DATA_PACKAGE",
    "READ_TABLES",
    "BundleFacts",
    "RegionRow",
    "Rule",
    "StudyFacts",
    "names_in_use",
    "region_columns",
    "region_key_columns",
    "write_bundle",
    "write_codebook",
    "write_data_package",
    "write_regions",
]
