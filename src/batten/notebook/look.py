"""The style sheet of the widget: the report's, and what ipywidgets' own parts need beside it."""

from __future__ import annotations

from batten.report.style import CSS

__all__ = ["style_sheet"]

_OWN = """
.batten-widget { max-width: 74em; overflow: hidden; }
.batten-widget .batten-report { max-width: none; margin: 0; }
.batten-widget .batten-report > .widget-html-content {
  line-height: 1.45; font-size: inherit; min-width: 0; max-width: 100%;
}
.batten-widget ul { padding-left: 1.3em; margin: .5em 0; }
.batten-widget li { margin: .25em 0; }
.batten-widget .batten-head { justify-content: space-between; align-items: flex-start; gap: 1em; }
.batten-widget .batten-head > .widget-html { flex: 1 1 auto; min-width: 0; }
.batten-widget .batten-head > button { flex: 0 0 auto; }
.batten-widget h3 { font-size: 1.1em; margin: .2em 0 .5em; }
.batten-widget code { font-family: var(--jp-code-font-family, ui-monospace, Menlo, monospace); font-size: .92em;
  font-weight: 400; background: none; padding: 0; color: inherit; }
.batten-widget .batten-short tbody th { min-width: 7em; }
.batten-widget .batten-short thead .batten-number { min-width: 6em; }
.batten-widget .batten-short td:last-child { min-width: 6em; }
/* a table of fifty rows scrolls in its own frame, under its heads */
.batten-widget .batten-tall .batten-scroll { max-height: 38em; overflow: auto; }
.batten-widget .batten-tall th, .batten-widget .batten-tall td { padding: .28em .5em; }
.batten-widget .batten-tall thead th { position: sticky; top: 0; background: var(--jp-layout-color1, #fff); }
/* titles wrap instead of being cut off */
.jupyter-widgets.widget-tab.batten-tabs > .lm-TabBar > .lm-TabBar-content { flex-wrap: wrap; }
.jupyter-widgets.widget-tab.batten-tabs > .lm-TabBar .lm-TabBar-tab { flex: 0 0 auto; min-width: 0; max-width: none; }
.batten-widget .batten-row, .batten-widget .batten-field { flex-wrap: wrap; align-items: center; gap: .2em .5em; }
.batten-widget .batten-row { gap: .2em 2em; align-items: flex-start; }
.batten-widget .widget-label { width: auto; min-width: 0; max-width: none; margin-right: .5em; }
.batten-widget .widget-text, .batten-widget .widget-dropdown { height: auto; flex-wrap: wrap; align-items: center; }
.batten-widget .batten-field .widget-inline-hbox > .widget-label {
  white-space: normal; height: auto; line-height: 1.4; flex: 0 1 auto; overflow-wrap: anywhere; text-align: left;
}
.batten-widget .widget-text > input { flex: 0 0 auto; width: 8em; }
.batten-widget .batten-picker > input { width: 28em; max-width: 100%; }
.batten-widget .batten-field .widget-toggle-buttons > .widget-label {
  white-space: normal; height: auto; line-height: 1.4; flex: 0 1 auto; max-width: 16em; overflow: visible;
}
.batten-widget .widget-dropdown > select { flex: 0 1 auto; width: auto; max-width: 100%; height: 2.2em; }
.batten-widget .batten-field .widget-toggle-buttons { display: flex; flex-flow: row nowrap; align-items: center; }
.batten-widget .widget-toggle-buttons .widget-toggle-button { width: auto; min-width: 0; }
/* panels are chosen by words with a rule below: lighter than the tabs above them */
.batten-widget .batten-pages .widget-toggle-button {
  background: transparent; box-shadow: none; border: 0; border-bottom: 3px solid transparent; border-radius: 0;
  padding: 0 .2em; margin: 0 1.1em .3em 0; color: var(--jp-ui-font-color2, #5a6a76); height: 2.1em; line-height: 1.8em;
}
.batten-widget .batten-pages .widget-toggle-button:hover { color: var(--jp-ui-font-color1, #1f2d38); }
.batten-widget .batten-pages .widget-toggle-button.mod-active {
  color: var(--jp-ui-font-color1, #1f2d38); border-bottom-color: #0b5688; font-weight: 600;
}
body[data-jp-theme-light="false"] .batten-widget .batten-pages .widget-toggle-button.mod-active {
  border-bottom-color: #7cbce6;
}
.batten-widget .widget-toggle-button:focus:not(:focus-visible) { outline: none; box-shadow: none; }
.batten-widget .widget-toggle-button:focus-visible, .batten-widget .jupyter-button:focus-visible {
  outline: 2px solid var(--jp-brand-color1, #1976d2); outline-offset: 1px;
}
"""


def style_sheet(token: str) -> str:
    """CSS. token: class of the static copy, hidden wherever this sheet is alive."""
    return f".{token}{{display:none!important}}\n{CSS}\n{_OWN}"
