"""How the page looks and the little that it does: its style sheet and its script."""

from __future__ import annotations

from aleafield.report.palette import css_variables
from aleafield.report.parts import CAUSES, INDICES, PARTS
from aleafield.report.svg import STYLE, part_style

_PAGE = """
*{box-sizing:border-box}
html{scroll-behavior:smooth}
body{margin:0;background:var(--paper);color:var(--ink);
font:16px/1.55 system-ui,'Segoe UI','Helvetica Neue',Arial,sans-serif}
main,header{max-width:1080px;margin:0 auto;padding:0 24px}
header{padding-top:44px}
h1{font-size:31px;line-height:1.2;margin:0 0 10px;font-weight:650;letter-spacing:-.01em;text-wrap:balance}
h2{font-size:21px;margin:52px 0 14px;padding-top:14px;border-top:2px solid var(--ink);font-weight:650}
h3{font-size:16px;margin:28px 0 8px;font-weight:650}
p{margin:0 0 12px;max-width:76ch}
.about{font-size:17px;color:var(--quiet);white-space:pre-line}
.facts{display:flex;flex-wrap:wrap;gap:6px 10px;padding:0;margin:18px 0 0;list-style:none;font-size:14px}
.facts li{background:var(--panel);border:1px solid var(--line);border-radius:99px;padding:3px 12px}
.facts .good{border-color:var(--part-time)}
.facts .bad{border-color:var(--alarm);color:var(--alarm);font-weight:600}
nav{margin:22px 0 0;font-size:14px}
nav a{color:var(--accent);margin-right:18px;text-decoration:none;white-space:nowrap}
nav a:hover{text-decoration:underline}
.cards{display:grid;grid-template-columns:repeat(auto-fit,minmax(300px,1fr));gap:16px}
.card,figure{background:var(--panel);border:1px solid var(--line);border-radius:10px;padding:18px 20px}
.card h3{margin:0;font-size:15px;color:var(--quiet);font-weight:500}
.card .big{font-size:30px;font-weight:650;line-height:1.25;margin:2px 0 0;font-variant-numeric:tabular-nums}
.card .big small{font-size:17px;font-weight:500;color:var(--quiet)}
.card .range{color:var(--quiet);margin-bottom:12px;font-variant-numeric:tabular-nums}
.card p{font-size:15px}
.card p:last-child{margin-bottom:0}
figure{margin:14px 0;overflow-x:auto}
figure svg{max-width:100%;height:auto;display:block;margin:0 auto}
figcaption{font-size:14px;color:var(--quiet);margin-top:10px;max-width:88ch}
figcaption b{color:var(--ink);font-weight:600}
.pair{display:grid;grid-template-columns:repeat(auto-fit,minmax(min(460px,100%),1fr));gap:14px;align-items:start}
.pair figure{margin:0;padding:16px}
.wide{overflow-x:auto;margin:10px 0 18px}
table{border-collapse:collapse;font-size:14px;font-variant-numeric:tabular-nums;min-width:60%}
caption{text-align:left;font-weight:600;padding:0 0 6px}
th,td{text-align:left;padding:6px 18px 6px 0;border-bottom:1px solid var(--line);vertical-align:top}
thead th{font-weight:500;color:var(--quiet);border-bottom:1px solid var(--quiet);vertical-align:bottom}
tbody th{font-weight:500}
td .small{color:var(--quiet);opacity:.75}
.reason{color:var(--alarm)}
details{margin:8px 0 18px}
summary{cursor:pointer;color:var(--accent);font-size:14px}
.lead{border-left:4px solid var(--accent);padding:2px 0 2px 14px}
.aim{margin-top:16px}
.warn li{margin-bottom:4px}
.equation{display:block;overflow-x:auto;margin:8px 0;white-space:nowrap;
font-family:Georgia,'Times New Roman',serif;font-size:1.06em}
.methods p{max-width:84ch}
.methods li{font-size:14px;margin-bottom:4px}
pre{background:var(--panel);border:1px solid var(--line);border-radius:10px;padding:16px 18px;overflow-x:auto;
font:13px/1.5 ui-monospace,'DejaVu Sans Mono',Menlo,Consolas,monospace}
code{font:13px ui-monospace,'DejaVu Sans Mono',Menlo,Consolas,monospace}
.caution{border:1px solid var(--mark);border-radius:10px;padding:14px 20px;margin:44px 0 60px;
background:var(--panel)}
.caution p:last-child{margin:0}
#readout{position:fixed;z-index:9;pointer-events:none;background:var(--ink);color:var(--paper);font-size:13px;
padding:4px 9px;border-radius:6px;max-width:320px}
button{font:inherit;font-size:14px;color:var(--accent);background:var(--panel);border:1px solid var(--line);
border-radius:99px;padding:3px 14px;cursor:pointer}
@media print{body{background:#fff}nav,button,#readout{display:none}figure,.card{break-inside:avoid}}
"""

SCRIPT = """
(function () {
  var readout = document.createElement('div');
  readout.id = 'readout';
  readout.hidden = true;
  document.body.appendChild(readout);
  document.querySelectorAll('svg.plot title').forEach(function (title) {
    var mark = title.parentNode;
    if (mark.classList.contains('plot')) return;
    mark.setAttribute('data-says', title.textContent);
    mark.removeChild(title);
  });
  document.addEventListener('pointermove', function (event) {
    var says = event.target.getAttribute ? event.target.getAttribute('data-says') : null;
    readout.hidden = !says;
    if (!says) return;
    readout.textContent = says;
    var room = window.innerWidth - readout.offsetWidth - 8;
    readout.style.left = Math.min(event.clientX + 14, room) + 'px';
    readout.style.top = Math.max(event.clientY - 34, 4) + 'px';
  });
  var tables = document.querySelectorAll('details');
  var button = document.createElement('button');
  var shown = false;
  function show(open) {
    shown = open;
    tables.forEach(function (table) { table.open = open; });
    button.textContent = open ? 'Hide all tables' : 'Show all tables';
  }
  button.addEventListener('click', function () { show(!shown); });
  window.addEventListener('beforeprint', function () { show(true); });
  show(false);
  document.querySelector('nav').appendChild(button);
})();
"""
"""Shows the value under the pointer and opens or closes all tables; the page is whole without it."""


def style_sheet() -> str:
    """All rules of the page, those of its drawings included."""
    styles = [
        *(part.style for part in PARTS),
        *(kind.style for kind in INDICES),
        *(cause.key for cause in CAUSES),
    ]
    colours = part_style(styles)
    return css_variables() + STYLE + colours + _PAGE
