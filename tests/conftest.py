"""What holds for all tests."""

from __future__ import annotations

from hypothesis import settings

# How long an example takes says more about the machine than about the program.
settings.register_profile("unhurried", deadline=None)
settings.load_profile("unhurried")
