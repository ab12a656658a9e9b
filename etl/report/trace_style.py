"""How the picture of a trial looks: colours for light, dark and paper, type, strokes.

Blue and vermilion keep apart for all kinds of colour vision (Okabe & Ito 2008, Color Universal
Design); darkened for light ground and lightened for dark ground until each has a contrast of 4.5
to 1 or more. No distinction rests on colour alone.
"""

from __future__ import annotations

from typing import Final

_LIGHT: Final = (
    "--ground:#ffffff;--ink:#1a2026;--muted:#525c66;--faint:#cbd2d9;--odd:#eef2f6;--even:#f8f5ee;"
    "--edge:#9aa5b1;--first:#0b5fa5;--back:#b33c00;--out:#5f6b76;--banner:#fff3d6"
)
_DARK: Final = (
    "--ground:#15181c;--ink:#e9ecef;--muted:#a9b3bd;--faint:#363d45;--odd:#1d232a;--even:#24221d;"
    "--edge:#5a6672;--first:#6db5f2;--back:#ff9b54;--out:#9aa5b1;--banner:#3a2f12"
)
_SANS: Final = "system-ui,'Segoe UI','Liberation Sans',Arial,sans-serif"
_MONO: Final = "ui-monospace,'DejaVu Sans Mono',Menlo,Consolas,'Courier New',monospace"

_RULES: Final = (
    ("", f"{_LIGHT};font-family:{_SANS};font-size:12px;max-width:100%;height:auto"),
    (" text", "fill:var(--ink)"),
    (" .ground", "fill:var(--ground)"),
    (" .title", "font-size:19px;font-weight:600"),
    (" .strong", "font-size:13px;font-weight:600"),
    (" .muted", "fill:var(--muted);font-size:13px"),
    (" .small", "fill:var(--muted);font-size:12px"),
    (" .time", "fill:var(--muted);font-size:11px;font-variant-numeric:tabular-nums"),
    (" .end", "text-anchor:end"),
    (" .middle", "text-anchor:middle"),
    (" .halo", "paint-order:stroke;stroke:var(--ground);stroke-width:5px;stroke-linejoin:round"),
    (" .banner", "fill:var(--banner);stroke:var(--edge)"),
    (" .text", f"font-family:{_MONO};white-space:pre"),
    (" .under-marks", "fill:var(--muted)"),
    (" .name", "font-size:11px;fill:var(--muted)"),
    (" .stripe.odd", "fill:var(--odd)"),
    (" .stripe.even", "fill:var(--even)"),
    (" .region", "stroke:var(--edge);stroke-width:1"),
    (" .region.odd", "fill:var(--odd)"),
    (" .region.even", "fill:var(--even)"),
    (" .tick", "stroke:var(--faint);stroke-width:1;stroke-dasharray:1 3;fill:none"),
    (" .cut", "stroke:var(--edge);stroke-width:1;fill:none"),
    (" .lead", "stroke:var(--edge);stroke-width:.8;fill:none"),
    (" .saccade", "stroke:var(--muted);stroke-width:1;fill:none"),
    (" .rail", "stroke:var(--back);stroke-width:6;fill:none"),
    (" .between-rails", "stroke:var(--ground);stroke-width:2.4;fill:none"),
    (" .arrowhead", "fill:var(--back);stroke:var(--ground);stroke-width:1"),
    (" .badge", "fill:var(--ground);stroke:var(--back);stroke-width:1.4"),
    (" .badge-text", "fill:var(--back);font-size:11px;font-weight:700"),
    (" .bar", "stroke:var(--first);stroke-width:1.6;fill:var(--first)"),
    (" .bar.later", "fill:var(--ground)"),
    (" .bar.outside", "stroke:var(--ink);stroke-width:1.2;fill:var(--ground)"),
    (" .bar.out", "stroke:var(--out);stroke-width:1.2;stroke-dasharray:3 2;fill:var(--ground)"),
    (" .cross", "stroke:var(--out);stroke-width:1.6;fill:none"),
    (" .beyond", "fill:var(--ink)"),
    (" .label", "font-size:11px;fill:var(--muted);font-variant-numeric:tabular-nums"),
    (" .number", "font-weight:700;fill:var(--ink)"),
    (" .fixation.out .label", "font-style:italic;fill:var(--out)"),
    (" .note", "font-size:11.5px"),
    (" .note.back", "fill:var(--back);font-weight:600"),
    (" .note.out,{0} .note.outside", "fill:var(--muted)"),
    (" .dot", "stroke:var(--first);stroke-width:1.2;fill:var(--first)"),
    (" .dot.later", "fill:var(--ground)"),
    (" .link", "stroke:var(--muted);stroke-width:1;fill:none"),
    (" .link.moved", "stroke:var(--back);stroke-width:1.6"),
    (" .link-tip", "fill:var(--back)"),
    (" .none", "stroke:var(--ink);stroke-width:1.4;fill:var(--ground)"),
    (" .doubt", "stroke:var(--ink);stroke-width:1.3;stroke-dasharray:2.4 2;fill:none"),
    (" .hand", "stroke:var(--ink);stroke-width:1.3;fill:none"),
    (" .fixation:target .bar", "stroke:var(--ink);stroke-width:4"),
)
_ROOT: Final = ".trace-picture"

#: The whole style sheet; each rule is about a picture of a trial only, so that many of them, or
#: one in a page, do not change one another.
STYLE: Final = (
    "".join(f"{_ROOT}{which.format(_ROOT)}{{{what}}}" for which, what in _RULES)
    + f"@media (prefers-color-scheme:dark){{{_ROOT}{{{_DARK}}}}}"
    + f"@media print{{{_ROOT}{{{_LIGHT}}}}}"
)
