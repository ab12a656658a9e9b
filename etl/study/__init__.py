"""The study file: what a session folder holds and what is to be made of it."""

from etl.study.load import Study, load_study

__all__ = ["Study", "load_study"]
