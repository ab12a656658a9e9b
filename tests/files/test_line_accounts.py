"""Where the lines of a file went: every line once, whatever stands in it."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence

import pytest
from hypothesis import given
from hypothesis import strategies as st

from etl.errors import Findings
from etl.files import Cells, FileAccount, RawText, cells_of

HEADER = "reader;trial;word\n"
NEEDED = ("reader", "trial", "word")
#: Pieces of a file below its header, each with the fate of its lines.
PIECES = {
    "plain row": ("P01;1;pear\n", ("rows",)),
    "quoted row": ('P01;"2";"a ""pear"""\n', ("rows",)),
    "row of two lines": ('P01;3;"pear\nplum"\n', ("rows", "further lines of rows")),
    "row around a blank line": (
        'P01;3;"pear\n\nplum"\n',
        ("rows", "further lines of rows", "further lines of rows"),
    ),
    "blank": ("\n", ("blank lines",)),
    "blanks": (" \t\n", ("blank lines",)),
    "remark": ("# noise outside\n", ("remarks",)),
    "remark with a quote": (' # the "noise;\n', ("remarks",)),
    "header again": (HEADER, ("repeated headers",)),
    "header again, quoted": ('"reader";"trial"; word\n', ("repeated headers",)),
}
ABOVE = {
    "banner": ("Export of May, all readers\n", ("banner above the header",)),
    "banner with separators": ("made;by;hand;\n", ("banner above the header",)),
    "banner with a quote": ('"Orchard" study\n', ("banner above the header",)),
    "blank": ("\n", ("blank lines",)),
    "remark": ("# of May\n", ("remarks",)),
}


def read(
    content: str, needed: Sequence[str] | None = NEEDED, remarks: Sequence[str] = ("#",)
) -> tuple[Cells | None, Findings]:
    """The cells of a log, and all that was found."""
    findings = Findings()
    text = RawText("log.csv", content.encode("utf-8"), "", "utf-8")
    return cells_of(text, findings, needed=needed, wary=True, remarks=remarks), findings


def counted(account: FileAccount) -> dict[str, int]:
    """How many lines there are of each fate."""
    return {fate: tally.count for fate, tally in account.lines.items()}


@given(
    st.lists(st.sampled_from(sorted(ABOVE)), max_size=5),
    st.lists(st.sampled_from(sorted(PIECES)), max_size=12),
    st.booleans(),
)
def test_every_line_is_counted_once(above: list[str], below: list[str], end: bool) -> None:
    """The fates of all lines add up to the lines of the file, and each is the right one."""
    pieces = [*(ABOVE[name] for name in above), (HEADER, ("header",))]
    pieces += [PIECES[name] for name in below]
    content = "".join(text for text, _ in pieces)
    content = content if end else content.removesuffix("\n")
    cells, findings = read(content)
    assert cells is not None, findings.text()
    fates = Counter(fate for _, own in pieces for fate in own)
    if not end and pieces[-1][0] == "\n":
        fates["blank lines"] -= 1  # a line end alone is no line where it is taken away
    assert counted(cells.account) == {fate: count for fate, count in fates.items() if count}
    assert cells.account.balances()
    assert cells.account.total == content.count("\n") + (not content.endswith("\n"))


@given(st.text(alphabet='a;1"# \t\n', max_size=60))
def test_account_balances_for_any_text(body: str) -> None:
    """Whatever can be read at all is counted to the last line."""
    cells, findings = read(HEADER + body)
    assert (cells is None) == findings.failed
    if cells is not None:
        content = HEADER + body
        assert cells.account.balances()
        assert cells.account.total == content.count("\n") + (not content.endswith("\n"))
        assert cells.account.lines.get("rows") is None or (
            cells.account.lines["rows"].count == len(cells)
        )


def test_first_lines_are_told() -> None:
    """Of each fate, the account names the first line."""
    cells, _ = read(f"banner\n\n# remark\n{HEADER}{HEADER}P01;1;pear\n\n# more\n")
    assert cells is not None
    firsts = {fate: tally.first_line for fate, tally in cells.account.lines.items()}
    assert firsts == {
        "banner above the header": 1,
        "blank lines": 2,
        "remarks": 3,
        "header": 4,
        "repeated headers": 5,
        "rows": 6,
    }


def test_header_of_two_lines_counts_as_two() -> None:
    """A name with a line break makes the header longer; so does each repetition of it."""
    header = '"reader";"trial\nnumber"\n'
    content = f"{header}P01;1\n{header}P02;1\n"
    cells, findings = read(content, needed=("reader", "trial\nnumber"))
    assert cells is not None, findings.text()
    assert counted(cells.account) == {"header": 2, "repeated headers": 2, "rows": 2}
    assert cells.lines.tolist() == [3, 6]


@pytest.mark.parametrize(("end", "opens"), [("", True), ("\n", False)], ids=["without", "with"])
def test_last_line_without_an_end_is_remembered(end: str, opens: bool) -> None:
    """A file that was cut may end within a line."""
    cells, _ = read(f"{HEADER}P01;1;pear{end}")
    assert cells is not None
    assert cells.ends_open is opens


@pytest.mark.parametrize("quote", ["", '"'], ids=["plain", "quoted"])
def test_remarks_by_other_signs(quote: str) -> None:
    """The signs of remarks are those of the study; the usual one is then text."""
    rows = f"% noise\n#1;1;{quote}pear{quote}\n  // noise\nP01;1;plum\n"
    cells, findings = read(f"% May\n{HEADER}{rows}", remarks=("%", "//"))
    assert cells is not None, findings.text()
    assert cells.column("reader").to_pylist() == ["#1", "P01"]
    assert counted(cells.account) == {"remarks": 3, "header": 1, "rows": 2}


@pytest.mark.parametrize("quote", ["", '"'], ids=["plain", "quoted"])
def test_no_sign_no_remarks(quote: str) -> None:
    """Where the study lists no sign, every line that is not blank is a row."""
    cells, findings = read(f"{HEADER}# 1;1;{quote}pear{quote}\n", remarks=())
    assert cells is not None, findings.text()
    assert cells.column("reader").to_pylist() == ["# 1"]


def test_remarks_like_rows_are_warned_of_by_their_sign() -> None:
    """The message names the signs that make a line a remark."""
    _, findings = read(f"{HEADER}P01;1;pear\n%P02;1;pear\n", remarks=("%", "//"))
    assert findings.lines() == [
        (
            "warning: log.csv:3: a line begins with % or // and has as many fields as the header; "
            "expected remarks, which are not read\n"
            "    fix: if this is a row, put its first cell in quotes"
        )
    ]
