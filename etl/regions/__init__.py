"""Region definition files into ordered regions with geometry; points and labels into regions."""

from etl.regions.assign import Assigned
from etl.regions.definition_files import read_definitions
from etl.regions.library import RegionLibrary
from etl.regions.sources import Text, TrialWords

__all__ = ["Assigned", "RegionLibrary", "Text", "TrialWords", "read_definitions"]
