"""From logs to a study file to start from: every guess with its evidence, every gap a question."""

from etl.drafting.drafted import Draft, draft
from etl.drafting.toml_text import Question

__all__ = ["Draft", "Question", "draft"]
