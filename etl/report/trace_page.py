"""One trial as a page: its picture, and the explanation as text that can be searched and copied.

A picture alone cannot break long sentences into lines, nor can they be copied out of it: what is
sent to a colleague is the page. It needs nothing else and runs no script.
"""

from __future__ import annotations

from typing import Final

from etl.report.trace_input import TracedTrial
from etl.report.trace_line_table import lines_on_page
from etl.report.trace_markup import text, wrapped
from etl.report.trace_picture import draw, identity
from etl.report.trace_words import Explanation, Statement, explain

_STYLE: Final = (
    ":root{color-scheme:light dark;--ground:#fff;--ink:#1a2026;--muted:#525c66;--edge:#cbd2d9;"
    "--link:#0b5fa5;--missing:#5f6b76}"
    "@media (prefers-color-scheme:dark){:root{--ground:#15181c;--ink:#e9ecef;--muted:#a9b3bd;"
    "--edge:#363d45;--link:#6db5f2;--missing:#9aa5b1}}"
    "@media print{:root{color-scheme:light;--ground:#fff;--ink:#1a2026;--muted:#525c66;"
    "--edge:#cbd2d9;--link:#0b5fa5;--missing:#5f6b76}}"
    "body{margin:0 auto;max-width:1200px;padding:16px;background:var(--ground);color:var(--ink);"
    "font:15px/1.5 system-ui,'Segoe UI','Liberation Sans',Arial,sans-serif}"
    "h1{font-size:22px;margin:0 0 8px}h2{font-size:18px;margin:28px 0 6px}"
    "h3{font-size:16px;margin:22px 0 4px}p{margin:4px 0}.muted{color:var(--muted)}"
    ".scroll{overflow-x:auto}"
    "table{border-collapse:collapse;width:100%}caption{text-align:left;color:var(--muted)}"
    "th,td{text-align:left;vertical-align:top;padding:3px 12px 3px 0;"
    "border-top:1px solid var(--edge);overflow-wrap:anywhere}"
    "th{font-weight:600;width:16em}td.fixations{width:9em;color:var(--muted)}"
    "table.lines{width:auto}.lines th,.lines td{width:auto;font-variant-numeric:tabular-nums}"
    "summary{cursor:pointer;margin:8px 0}tr.unsure td{font-weight:600}"
    "tr.missing td{color:var(--missing)}a{color:var(--link)}"
    "nav ol{list-style:none;padding:0;margin:6px 0;display:flex;flex-wrap:wrap;gap:2px 14px}"
    "@media print{nav{display:none}tr{break-inside:avoid}h3{break-after:avoid}}"
)


def page(traced: TracedTrial, explanation: Explanation | None = None, *, remark: str = "") -> str:
    """Show a trial on a page of its own.

    Parameters
    ----------
    traced : TracedTrial
        The trial.
    explanation : Explanation, optional
        The part to be shown under the picture; the whole where absent.
    remark : str
        What stands under the heading, such as the decisions under which the trial is shown.

    Returns
    -------
    str
        An HTML document that needs nothing else. The fixations that decide an outcome are links
        to their bars in the picture.

    Examples
    --------
    >>> trial = TracedTrial("P1", "", "7", "i<1>", {}, ("who",), ("",), (), (), {}, {})
    >>> "<h1>participant P1, trial 7, item i&lt;1&gt;</h1>" in page(trial)
    True
    """
    said = explanation or explain(traced)
    own = identity(traced)
    parts = [
        wrapped("h1", {}, [text(said.heading)]),
        *([wrapped("p", {}, [text(remark)])] if remark else []),
        wrapped("div", {"class": "scroll", "tabindex": "0"}, [draw(traced)]),
    ]
    if said.left_out:
        items = [wrapped("li", {}, [text(sentence)]) for sentence in said.left_out]
        parts += [wrapped("h2", {}, ["Left out, or aside"]), wrapped("ul", {}, items)]
    if said.lines:
        items = [wrapped("li", {}, [text(sentence)]) for sentence in said.lines]
        parts += [wrapped("h2", {}, ["Lines"]), wrapped("ul", {}, items)]
        if said.whole:
            summary = wrapped("summary", {}, ["Every fixation and its line"])
            table = lines_on_page(traced, own)
            within = wrapped("div", {"class": "scroll", "tabindex": "0"}, [table])
            parts.append(wrapped("details", {}, [summary, within]))
    regions = [region for region in said.regions if region.statements]
    if regions:
        parts.append(wrapped("h2", {}, ["Why each outcome is what it is"]))
        links = [
            wrapped("li", {}, [wrapped("a", {"href": f"#r{r.order}"}, [text(r.name)])])
            for r in regions
        ]
        parts.append(wrapped("nav", {"aria-label": "regions"}, [wrapped("ol", {}, links)]))
    for region in regions:
        words = f" “{region.text.strip()}”" if region.text.strip() else ""
        head = [text(region.name), wrapped("span", {"class": "muted"}, [text(words)])]
        parts.append(wrapped("h3", {"id": f"r{region.order}"}, head))
        parts.append(_table(f"region {region.order}", region.statements, own))
    if said.trial:
        parts += [
            wrapped("h3", {}, ["The trial"]),
            _table("outcomes of the trial as a whole", said.trial, own),
        ]
    main = wrapped("main", {}, parts)
    return (
        '<!doctype html>\n<html lang="en"><head><meta charset="utf-8">'
        '<meta name="viewport" content="width=device-width, initial-scale=1">'
        f"<title>{text(said.heading)}</title><style>{_STYLE}</style></head>"
        f"<body>{main}</body></html>\n"
    )


def _table(caption: str, statements: tuple[Statement, ...], own: str) -> str:
    """What is said of outcomes, one a row, with the fixations that decide each."""
    rows = [wrapped("caption", {}, [text(caption)])]
    for statement in statements:
        links = " ".join(
            wrapped("a", {"href": f"#{own}-f{number}"}, [str(number)])
            for number in dict.fromkeys(statement.fixations)
        )
        cells = [
            wrapped("th", {"scope": "row"}, [text(statement.measure)]),
            wrapped("td", {}, [text(statement.sentence)]),
            wrapped("td", {"class": "fixations"}, [links]),
        ]
        rows.append(wrapped("tr", {"class": "missing" if statement.reason else "valued"}, cells))
    return wrapped("table", {}, rows)
