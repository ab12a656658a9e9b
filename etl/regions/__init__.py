"""Region definition files into ordered regions with geometry; points and labels into regions."""

from typing import TYPE_CHECKING

from etl.lazily import loader
from etl.regions.assign import Assigned
from etl.regions.library import RegionLibrary
from etl.regions.sources import Text, TrialWords

if TYPE_CHECKING:
    from etl.regions.definition_files import read_definitions

__all__ = ["Assigned", "RegionLibrary", "Text", "TrialWords", "read_definitions"]

__getattr__ = loader(__name__, {"read_definitions": "etl.regions.definition_files"})
