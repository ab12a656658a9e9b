"""The study file: what a session folder holds and what is to be made of it."""

from etl.study.load import Study, load_study
from etl.study.variant_comparisons import NamedComparison
from etl.study.variants import StudyVariants, load_variants

__all__ = ["NamedComparison", "Study", "StudyVariants", "load_study", "load_variants"]
