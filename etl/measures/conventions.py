"""The two conventions on which labs differ, as a study file spells them."""

from typing import Literal

#: What a fixation outside every region does: it is as good as absent, or it ends the visit in
#: progress, in no direction.
Outside = Literal["ignore", "interrupt"]

#: What a binary or count outcome is where the reader had no chance: missing with a reason, or 0.
NoOpportunity = Literal["missing", "zero"]
