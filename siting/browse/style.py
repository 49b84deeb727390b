"""The style of the pages: a report on paper, in the colours of `siting.sharing.looks`."""

from __future__ import annotations

LARGEST_WIDTH_PX = 1760
"""Pages are no wider than this, so that lines stay readable on wide screens."""

STYLE = f"""
.stMainBlockContainer {{max-width:{LARGEST_WIDTH_PX}px; padding:4.3rem 2.2rem 4rem; margin:0 auto;}}
.stMainBlockContainer > .stVerticalBlock {{gap:.7rem;}}
.stMainBlockContainer .stVerticalBlock {{gap:.6rem;}}
.stElementContainer:has(> .stHtml > style) {{display:none;}}

header[data-testid="stHeader"] {{border-bottom:1px solid var(--rule); background:var(--paper); height:3.4rem;
 min-height:3.4rem;}}
header [data-testid="stToolbar"] {{max-width:{LARGEST_WIDTH_PX}px; margin:0 auto; padding:0 2.2rem 0 1.1rem;}}
nav[data-testid="stTopNav"] {{display:flex; align-items:stretch; gap:1.5rem;}}
nav[data-testid="stTopNav"]::before {{content:"siting"; order:-1; align-self:center; margin-right:.6rem;
 padding:0 .1rem; font-weight:700; font-size:1.12rem; letter-spacing:-.02em; color:var(--teal);
 border-bottom:3px double var(--teal);
 line-height:1.15;}}
a[data-testid="stTopNavLink"], a[data-testid="stTopNavLink"]:hover {{background:none; padding:.2rem .1rem;
 border-radius:0; border-bottom:3px solid transparent;}}
a[data-testid="stTopNavLink"]:hover {{border-bottom-color:var(--border);}}
a[data-testid="stTopNavLink"][aria-current="page"] {{background:none; border-bottom-color:var(--ink);}}
a[data-testid="stTopNavLink"] p {{font-size:1rem; color:var(--ink);}}

h1.headline {{font-size:1.42rem; line-height:1.3; font-weight:650; color:var(--ink); margin:.1rem 0 .2rem;
 padding:0; max-width:92rem; letter-spacing:-.01em; text-wrap:pretty;}}
p.second {{color:var(--quiet); font-size:1rem; margin:0; max-width:72rem;}}
h2.section {{font-size:1.12rem; font-weight:650; color:var(--ink); margin:1.3rem 0 0; padding:.8rem 0 0;
 border-top:1px solid var(--ink);}}
p.lead {{color:var(--quiet); font-size:.94rem; margin:.15rem 0 0; max-width:62rem;}}
.notices p.title {{color:var(--ink); font-weight:650; font-size:.94rem; margin:0 0 .3rem;}}
p.notice {{border-left:4px solid var(--slate); background:var(--panel); padding:.45rem .8rem; margin:0 0 .35rem;
 color:var(--ink); max-width:78rem; font-size:.96rem; overflow-wrap:anywhere;}}
p.notice.stale {{border-left-color:var(--ochre);}}
p.notice.fault {{border-left-color:var(--fault);}}
.st-key-stale {{border-left:4px solid var(--ochre); padding-left:1.1rem;}}
.st-key-stale h1.headline {{color:var(--quiet);}}

dl.columns {{margin:0 !important; padding:0 !important; font-size:.88rem; line-height:1.35;}}
dl.columns dt {{font-weight:600; color:var(--ink); margin-top:.45rem;}}
dl.columns dt span {{font-weight:400; color:var(--quiet);}}
dl.columns dd {{color:var(--quiet);}}
dl.columns dt, dl.columns dd {{margin-left:0 !important; padding-left:0 !important;}}
[data-testid="stCaptionContainer"], [data-testid="stCaptionContainer"] p {{color:var(--quiet) !important; opacity:1;}}

div.frame {{overflow-x:auto;}}
div.frame.tall {{max-height:44rem; overflow-y:auto;}}
table.report {{border-collapse:collapse; width:100%; font-size:.9rem; color:var(--ink);
 font-variant-numeric:tabular-nums;}}
table.report caption {{text-align:left; color:var(--ink); font-weight:650; font-size:.94rem; padding-bottom:.2rem;}}
table.report th {{text-align:left; font-weight:600; color:var(--quiet); border-bottom:1px solid var(--ink);
 padding:.25rem .55rem .25rem 0; vertical-align:bottom; font-size:.8rem;}}
table.report td {{padding:.26rem .55rem .26rem 0; border-bottom:1px solid var(--rule); vertical-align:top;
 overflow-wrap:anywhere;}}
table.report .n {{text-align:right;}}
table.report td.n {{white-space:nowrap;}}
table.report th, table.report td.verdict {{overflow-wrap:normal;}}
table.report td.name {{min-width:9rem;}}
table.report tr.total td {{border-top:1px solid var(--ink); font-weight:650;}}
table.report tr.faint td {{color:var(--quiet);}}
table.report td.verdict {{white-space:nowrap; font-weight:600;}}
table.report img {{vertical-align:-4px; margin-right:.4rem; display:inline;}}
iframe {{border:1px solid var(--rule);}}
.stMain iframe, .stElementContainer:has(iframe) {{min-height:min(64vh, 1000px);}}
"""
"""CSS for every page; colours are the custom properties of `looks.css_colours`."""
