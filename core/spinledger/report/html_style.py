"""Style sheet of the report: light, A4, one rule family, nothing from outside."""

from __future__ import annotations

from spinledger.report.palette import FONT_STACK, HAIRLINE, INK, MUTED, PAPER, RULE


def style_sheet(source: str, work: str) -> str:
    """CSS text.

    Parameters
    ----------
    source, work : str
        What stands at the left and in the middle of every printed page's foot.
    """
    return f"""
@page {{ size: A4; margin: 16mm;
  @bottom-left {{ content: {_css_text(source)}; font: 7.5pt {FONT_STACK}; color: {MUTED}; }}
  @bottom-center {{ content: {_css_text(work)}; font: 7.5pt {FONT_STACK}; color: {MUTED}; }}
  @bottom-right {{ content: "Page " counter(page) " of " counter(pages);
    font: 7.5pt {FONT_STACK}; color: {MUTED}; }} }}
* {{ box-sizing: border-box; }}
html {{ background: {PAPER}; color: {INK}; font: 9pt/1.4 {FONT_STACK};
  font-variant-numeric: tabular-nums; -webkit-print-color-adjust: exact;
  print-color-adjust: exact; }}
body {{ margin: 0 auto; padding: 24px 16px; max-width: 705px; }}
h1, h2, h3, h4, p, figure, dl, ol, ul {{ margin: 0; }}
h1 {{ font-size: 19pt; line-height: 1.3; padding-bottom: 3px; font-weight: 600; overflow-wrap: anywhere; }}
h2.verdict {{ font-size: 16pt; line-height: 1.25; font-weight: 600; }}
h3 {{ font-size: 10.5pt; font-weight: 600; break-after: avoid; }}
h4 {{ font-size: 9pt; font-weight: 600; margin-top: 8px; break-after: avoid; }}
.over {{ display: flex; justify-content: space-between; color: {MUTED}; }}
.under, .muted, .probability {{ color: {MUTED}; }}
.probability {{ font-size: 11pt; font-weight: 400; }}
.small {{ font-size: 8pt; }}
header {{ border-bottom: 2px solid {INK}; padding-bottom: 12px; }}
section {{ padding-top: 14px; }}
.answer {{ display: grid; grid-template-columns: 1fr auto; gap: 16px;
  border-bottom: 1px solid {RULE}; padding: 12px 0; align-items: center; }}
.answer .words {{ display: grid; grid-template-columns: 44px 1fr; gap: 8px; }}
.answer p {{ margin-top: 4px; }}
.scales {{ overflow: visible; margin-top: 2px; }}
.sketch svg {{ max-width: 330px; height: auto; display: block; }}
.head {{ display: flex; justify-content: space-between; align-items: baseline; gap: 12px; }}
.head .muted {{ font-size: 8pt; }}
figure.wide svg {{ width: 100%; height: auto; display: block; }}
figure {{ break-inside: avoid; }}
table {{ border-collapse: collapse; width: 100%; font-size: 8.5pt; margin-top: 6px;
  border-top: 1.5px solid {INK}; border-bottom: 1px solid {INK}; }}
thead {{ display: table-header-group; }}
tfoot {{ display: table-row-group; }}
th, td {{ text-align: left; padding: 4px 10px 4px 0; vertical-align: top;
  overflow-wrap: break-word; }}
th:last-child, td:last-child {{ padding-right: 0; }}
thead th {{ font-weight: 400; color: {MUTED}; border-bottom: 1px solid {RULE}; }}
tbody th {{ font-weight: 600; white-space: nowrap; }}
tbody tr {{ border-bottom: 1px solid {HAIRLINE}; break-inside: avoid; }}
tbody tr.noted {{ border-bottom: 0; break-after: avoid; }}
tr.note td {{ padding-top: 0; color: {MUTED}; font-size: 8pt; }}
td.state {{ white-space: nowrap; }}
.assignment td:nth-child(2), .assignment td:nth-child(3),
.assignment td:nth-child(6), .assignment td:nth-child(7) {{ white-space: nowrap; }}
.assignment {{ border-bottom: 3px double {INK}; }}
.assignment tfoot td {{ font-weight: 600; border-top: 1px solid {RULE}; }}
.assignment tfoot td:nth-child(5) {{ font-weight: 400; color: {MUTED}; }}
sub {{ font-size: 75%; line-height: 0; }}
.held {{ white-space: nowrap; }}
.mark {{ vertical-align: -1px; }}
.journal {{ font-size: 9.5pt; line-height: 1.5; margin-top: 4px; }}
.cautions ul {{ padding-left: 14px; font-size: 8.5pt; color: {MUTED}; margin-top: 4px; }}
.cautions li {{ break-inside: avoid; }}
ol {{ padding-left: 20px; }}
.expansions {{ display: grid; grid-template-columns: 1fr 1fr; gap: 14px 17px;
  margin-top: 8px; }}
.expansions figcaption {{ font-size: 8pt; color: {MUTED}; text-align: center; }}
.expansions svg {{ width: 100%; height: auto; display: block; }}
dl {{ display: grid; grid-template-columns: 140px 1fr; gap: 2px 10px; font-size: 8.5pt;
  margin-top: 6px; }}
dt {{ color: {MUTED}; }}
dd {{ margin: 0; overflow-wrap: anywhere; }}
.signatures td {{ height: 26px; }}
footer {{ max-width: 705px; margin: 0 auto; padding: 8px 16px; display: flex;
  justify-content: space-between; color: {MUTED}; font-size: 8pt;
  border-top: 1px solid {RULE}; }}
@media print {{
  body {{ padding: 0; max-width: none; }}
  footer {{ display: none; }}
}}
@media (max-width: 560px) {{
  .answer, .expansions {{ grid-template-columns: 1fr; }}
  table {{ display: block; overflow-x: auto; }}
}}
"""


def _css_text(words: str) -> str:
    escaped = words.replace("\\", "\\\\").replace('"', '\\"')
    return f'"{escaped}"'.replace("<", "\\3c ")
