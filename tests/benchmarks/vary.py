"""Variants of the sample study against one build of it: whole commands, one process.

Run as ``python tests/benchmarks/vary.py``. Quote the ratios; seconds are those of one machine.
"""

from __future__ import annotations

import shutil
import statistics
import subprocess
import sys
import tempfile
import time
from pathlib import Path

PROJECT = Path(__file__).resolve().parents[2]
#: How often each command is run; the middle one counts.
_TIMES = 5
#: Variants files by how many variants they make.
_FILES = {
    2: "[screening.fixations]\nunder_ms = [80, 100]\n",
    100: """\
[screening.fixations]
under_ms = [false, 60, 80, 100, 120]
over_ms = [600, 700, 800, 1000, false]
[screening.trials]
outside_share_over = [0.20, 0.30]
[measures]
no_opportunity = ["missing", "zero"]
""",
    1000: """\
[screening.fixations]
blink = ["drop", false]
under_ms = [false, 60, 80, 100, 120]
over_ms = [600, 700, 800, 1000, false]
[screening.trials]
outside_share_over = [0.10, 0.20, 0.30, 0.40, false]
[regions]
tolerance_px = [0, 14]
[measures]
no_opportunity = ["missing", "zero"]
""",
}


def run(*arguments: object) -> float:
    """How long a command of the program takes, in seconds."""
    command = [sys.executable, "-c", "from etl.start import main; main()", *map(str, arguments)]
    started = time.perf_counter()
    subprocess.run(command, check=True, stdout=subprocess.DEVNULL, cwd=PROJECT)
    return time.perf_counter() - started


def main() -> None:
    """Time builds and variants in turn, so that what else the machine does meets both."""
    with tempfile.TemporaryDirectory() as name:
        root = Path(name)
        shutil.copytree(PROJECT / "region_definitions", root / "region_definitions")
        lab = root / "sample_logs" / "orchard"
        shutil.copytree(
            PROJECT / "sample_logs" / "orchard",
            lab,
            ignore=shutil.ignore_patterns("out*", "variants"),
        )
        study = lab / "study.toml"
        files = {}
        for count, text in _FILES.items():
            files[count] = lab / f"variants_{count}.toml"
            files[count].write_text(text, encoding="utf-8")
        times: dict[str, list[float]] = {}
        for _ in range(_TIMES):
            shutil.rmtree(lab / "out.kept", ignore_errors=True)
            build = ("build", study, "--workers", 1, "--quiet")
            times.setdefault("build, nothing kept", []).append(run(*build))
            for count, path in files.items():
                own = run("vary", study, path, "--workers", 1, "--quiet")
                times.setdefault(f"vary, {count:,} variants", []).append(own)
        middle = {name: statistics.median(own) for name, own in times.items()}
        whole = middle["build, nothing kept"]
        for name, own in middle.items():
            print(f"{name:<24} {own:6.2f} s  {own / whole:5.2f} x a build")
        more = middle["vary, 1,000 variants"] - middle["vary, 2 variants"]
        print(f"a variant more: {more / 998 / whole:.4f} x a build")


if __name__ == "__main__":
    main()
