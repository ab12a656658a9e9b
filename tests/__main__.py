"""All checks of the project, one after the other: ``python -m tests`` in the checkout.

The style of the code, its types, then all tests. Words after the command go to pytest.
"""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

ROOT = Path(__file__).resolve().parents[1]
CHECKS = (
    ("format", ["ruff", "format", "--check", "."]),
    ("lint", ["ruff", "check", "."]),
    ("types", ["mypy"]),
    ("tests", ["pytest", "-n", "auto", "-q"]),
)


def main() -> int:
    """Run every check, even after one has failed; 0 only where all passed."""
    failed = []
    for name, command in CHECKS:
        given = sys.argv[1:] if name == "tests" else []
        print(f"== {name}: {' '.join([*command, *given])}", flush=True)
        done = subprocess.run([sys.executable, "-m", *command, *given], cwd=ROOT, check=False)
        if done.returncode:
            failed.append(name)
    print(f"failed: {', '.join(failed)}" if failed else "all checks passed", flush=True)
    return 1 if failed else 0


if __name__ == "__main__":
    sys.exit(main())
