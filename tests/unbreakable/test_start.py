"""An interruption before the libraries are loaded."""

from __future__ import annotations

import subprocess
import sys

#: Interrupts itself while the command is loaded.
PROGRAM = """
import sys
class Interrupting:
    def find_spec(self, name, path=None, target=None):
        if name == "click":
            raise KeyboardInterrupt
sys.meta_path.insert(0, Interrupting())
from etl.start import main
main()
"""


def test_command_that_is_interrupted_while_it_loads_says_so() -> None:
    """Status 130 and one line, no traceback."""
    ran = subprocess.run(
        [sys.executable, "-c", PROGRAM], capture_output=True, text=True, check=False
    )
    assert (ran.returncode, ran.stdout, ran.stderr) == (130, "", "interrupted\n")
