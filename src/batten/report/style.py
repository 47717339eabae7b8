"""The look of everything shown: colours, lines, type and style sheet in one place.

Two hues carry meaning: the straight line is amber and dashed, the choice is blue and solid. Amber against blue is a
difference that the common kinds of colour blindness keep, and the dash keeps it in grey print. All else is ink.
Figures stay opaque white in dark notebooks; text, tables and frames follow the notebook's theme.
"""

from __future__ import annotations

__all__ = [
    "BAND", "BEYOND", "CHOICE", "COOL", "CSS", "DATA", "DPI", "FAINT", "FONT", "INK", "LINE", "LINE_BAND",
    "OUTER", "PAPER", "QUIET",
    "RULE", "SMALL", "TEXT", "TITLE", "WIDTH",
]  # fmt: skip

PAPER = "#ffffff"
#: words and marks that matter; 14:1 on white
INK = "#1f2d38"
#: words that stand back; 5.6:1 on white
QUIET = "#5a6a76"
#: axes and frames
RULE = "#b3bdc4"
#: grid lines
FAINT = "#e7ebee"
DATA = "#7d8b96"
#: the straight line; 5.4:1 on white
LINE = "#a8520a"
#: the choice (or the remedy a figure is about); 7.8:1 on white
CHOICE = "#0b5688"
BAND, LINE_BAND = "#a9cbe3", "#eccfb0"
#: ground outside the central 90% of the predictor, and beyond its last rows
OUTER, BEYOND = "#f4f6f7", "#e4e9ec"
#: steps from the smallest gap to the largest, dark to light, read in grey too
COOL = ("#0b5688", "#39779f", "#7ba7c4", "#b3cddd", "#dde8ee", "#f3f6f8")

#: points; DejaVu Sans comes with matplotlib, so figures look alike everywhere
FONT = "DejaVu Sans"
TITLE, TEXT, SMALL = 9.5, 8.5, 7.5
#: inches; shown at 100 CSS pixels per inch, drawn at DPI
WIDTH, DPI = 7.6, 144

CSS = """
.batten-report {
  --batten-ink: var(--jp-ui-font-color1, #1f2d38); --batten-quiet: var(--jp-ui-font-color2, #5a6a76);
  --batten-rule: var(--jp-border-color1, #b3bdc4); --batten-faint: var(--jp-border-color2, #e7ebee);
  --batten-choice: #0b5688; --batten-line: #a8520a;
  color: var(--batten-ink); font-family: var(--jp-ui-font-family, system-ui, -apple-system, "Segoe UI", sans-serif);
  font-size: var(--jp-content-font-size1, 14px); line-height: 1.5; max-width: 66em;
}
body[data-jp-theme-light="false"] .batten-report { --batten-choice: #7cbce6; --batten-line: #e8a25c; }
.batten-report .batten-headline { font-size: 1.2em; font-weight: 600; margin: 0 0 .35em; }
.batten-report h2, .batten-report .batten-title { font-size: 1.05em; margin: 1.5em 0 .4em; }
.batten-report p { margin: .4em 0; }
.batten-report .batten-span { border-left: 4px solid var(--batten-choice); padding-left: .7em; margin: .8em 0; }
.batten-report .batten-quiet { color: var(--batten-quiet); font-size: .92em; }
.batten-report .batten-caution { border-left: 4px solid var(--batten-line); padding-left: .7em; margin: .6em 0; }
.batten-report .batten-figure { margin: .7em 0; }
.batten-report .batten-figure img { background: #fff; max-width: 100%; height: auto; border-radius: 2px; }
.batten-report .batten-scroll { overflow-x: auto; }
.batten-report table.batten-table { border-collapse: collapse; margin: .5em 0; font-size: .93em; border: 0;
  color: var(--batten-ink); }
.batten-report .batten-table th, .batten-report .batten-table td {
  padding: .28em .75em; border: 0; border-bottom: 1px solid var(--batten-faint); background: transparent;
  color: inherit; text-align: left; vertical-align: top; white-space: normal; max-width: 24em;
  overflow-wrap: break-word;
}
.batten-report .batten-table thead th {
  color: var(--batten-quiet); font-weight: 600; border-bottom: 1px solid var(--batten-rule); vertical-align: bottom;
}
.batten-report .batten-table .batten-number { text-align: right; font-variant-numeric: tabular-nums; }
.batten-report .batten-table td.batten-number { white-space: nowrap; }
.batten-report .batten-table .batten-words { min-width: 11em; }
.batten-report .batten-table tbody tr, .batten-report .batten-table tbody tr:nth-child(odd) { background: transparent; }
.batten-report .batten-table tr.batten-choice th { box-shadow: inset 4px 0 var(--batten-choice); }
.batten-report .batten-table tr.batten-line th { box-shadow: inset 4px 0 var(--batten-line); }
.batten-report .batten-table tbody th { font-weight: 400; }
.batten-report .batten-table tr.batten-choice th { font-weight: 600; }
.batten-report .batten-table .batten-under { color: var(--batten-quiet); font-size: .88em; font-weight: 400; }
.batten-report .batten-table .batten-key { font-family: var(--jp-code-font-family, ui-monospace, Menlo, monospace); }
.batten-report .batten-table .batten-whole, .batten-report .batten-table tbody .batten-key { white-space: nowrap; }
.batten-report details { margin: .6em 0; }
.batten-report summary { cursor: pointer; color: var(--batten-choice); }
.batten-report pre.batten-code {
  font-family: var(--jp-code-font-family, ui-monospace, Menlo, monospace); font-size: .86em; line-height: 1.4;
  background: var(--jp-layout-color2, #f4f6f7); color: var(--batten-ink); padding: .8em 1em; overflow-x: auto;
  white-space: pre;
}
@media print { .batten-report details > * { display: block; } .batten-report .batten-figure { break-inside: avoid; } }
"""
