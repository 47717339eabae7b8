"""The style sheet of the widget: the report's, and what ipywidgets' own parts need beside it."""

from __future__ import annotations

from batten.report.style import CSS

__all__ = ["style_sheet"]

_OWN = """
.batten-widget { max-width: 66em; overflow: hidden; }
.batten-widget .batten-report { max-width: none; margin: 0; }
.batten-widget .batten-report > .widget-html-content { line-height: 1.45; }
.batten-widget h3 { font-size: 1.05em; margin: .4em 0; }
.batten-widget .batten-message:empty { display: none; }
/* titles wrap instead of being cut off */
.jupyter-widgets.widget-tab.batten-tabs > .lm-TabBar > .lm-TabBar-content { flex-wrap: wrap; }
.jupyter-widgets.widget-tab.batten-tabs > .lm-TabBar .lm-TabBar-tab { flex: 0 0 auto; min-width: 0; max-width: none; }
.batten-widget .batten-row, .batten-widget .batten-field { flex-wrap: wrap; align-items: center; gap: .3em .5em; }
.batten-widget .widget-toggle-buttons .widget-toggle-button { width: auto; }
"""


def style_sheet(token: str) -> str:
    """CSS. token: class of the static copy, hidden wherever this sheet is alive."""
    return f".{token}{{display:none!important}}\n{CSS}\n{_OWN}"
