"""Parts of the README that are made from the code; ``python -m tests.documents`` rewrites them."""

from __future__ import annotations

import re
from pathlib import Path

from etl.study.reference import key_reference
from etl.tables import table_reference

README = Path(__file__).resolve().parents[1] / "README.md"
PARTS = {"tables": table_reference, "keys": key_reference}


def with_parts(text: str) -> str:
    """The README with every made part as the code has it now."""
    for name, make in PARTS.items():
        pattern = rf"(<!-- {name} -->\n).*?(<!-- end of {name} -->)"
        made = make().strip()
        text, count = re.subn(
            pattern, lambda found, made=made: f"{found[1]}{made}\n{found[2]}", text, flags=re.DOTALL
        )
        if count != 1:
            raise ValueError(f"the README needs one place for the {name}, and has {count}")
    return text


if __name__ == "__main__":
    README.write_text(
        with_parts(README.read_text(encoding="utf-8")), encoding="utf-8", newline="\n"
    )
