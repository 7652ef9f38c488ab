"""Colours and type of the charts, once for a page or once for a file that stands alone.

Light and dark follow the reader's setting; paper is always light. Nothing is told by colour alone: the limit is
dashed and shaded, a rejected point is a cross, an undecided one is hollow.
"""

CHART_STYLE = """\
.lc{--ink:#1b2a33;--mid:#5b6b75;--rule:#d5dce0;--hair:#eaeef0;--theory:#0a5a76;--limit:#a33a1f;--point:#111c23;\
--bar:#7fa6b5;--ground:#fff;max-width:100%;height:auto;\
font:11.5px/1.2 "Liberation Sans","Helvetica Neue",Helvetica,Arial,sans-serif;\
font-variant-numeric:tabular-nums}
.lc text{fill:var(--ink)}
.lc .mid{fill:var(--mid)}
.lc .ground{fill:var(--ground)}
.lc .frame{fill:none;stroke:var(--mid)}
.lc .rule{stroke:var(--rule);fill:none}
.lc .hair{stroke:var(--hair);fill:none}
.lc .theory{stroke:var(--theory);stroke-width:1.8;fill:none}
.lc .second{stroke:var(--mid);stroke-width:1.3;stroke-dasharray:1.5 3;stroke-linecap:round;fill:none}
.lc .limit{stroke:var(--limit);stroke-width:1.6;stroke-dasharray:7 3.5;fill:none}
.lc .beyond{fill:var(--limit);fill-opacity:.065}
.lc .guard{stroke:var(--limit);stroke-width:1.2;fill:none}
.lc .t-theory{fill:var(--theory)}
.lc .t-limit{fill:var(--limit)}
.lc .err{stroke:var(--point);stroke-width:1.1;fill:none}
.lc .dot{fill:var(--point);stroke:var(--ground);stroke-width:1}
.lc .hollow{fill:var(--ground);stroke:var(--point);stroke-width:1.5}
.lc .cross{stroke:var(--limit);stroke-width:2.4;fill:none}
.lc .halo{stroke:var(--ground);stroke-width:3.5;stroke-linejoin:round;paint-order:stroke}
.lc .bar{fill:var(--bar)}
.lc .sum{fill:var(--theory)}
.lc .band{fill:var(--theory);fill-opacity:.1}
@media screen and (prefers-color-scheme:dark){.lc{--ink:#e3e9ec;--mid:#9badb7;--rule:#37454d;--hair:#27333a;\
--theory:#6fc3dd;--limit:#f0947a;--point:#f4f7f8;--bar:#3f7488;--ground:#141c21}}
"""
