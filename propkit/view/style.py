"""The style sheet of a sheet: small, scoped, themed through Jupyter's variables, grey in print.

A picture cannot see the theme of its page. Drawings are made for light paper and turned over in the dark by a filter; equations
are blended onto the paper, so that their plate vanishes. Without this style sheet both stand on their own light plate.
"""

from __future__ import annotations

import re

from propkit.view import palette

_LIGHT = (
    f"--pk-accent:{palette.ACCENT};--pk-doubt:{palette.DOUBT};--pk-bar:{palette.SERIES[0]};"
    f"--pk-ink:var(--jp-content-font-color1,{palette.INK});--pk-quiet:{palette.QUIET};--pk-line:{palette.HAIRLINE};"
    "--pk-paper:var(--jp-layout-color1,#fff);--pk-pic:none;--pk-eq:none;--pk-blend:multiply"
)
_DARK = (
    f"--pk-accent:{palette.ACCENT_DARK};--pk-doubt:{palette.DOUBT_DARK};--pk-bar:{palette.BAR_DARK};"
    f"--pk-ink:var(--jp-content-font-color1,{palette.INK_DARK});--pk-quiet:{palette.QUIET_DARK};--pk-line:{palette.HAIRLINE_DARK};"
    f"--pk-paper:var(--jp-layout-color1,{palette.PLATE_DARK});--pk-pic:invert(.9) hue-rotate(180deg) saturate(1.15);--pk-eq:invert(1);"
    "--pk-blend:screen"
)

_CSS = f"""
.propkit-sheet{{{_LIGHT};color:var(--pk-ink);background:var(--pk-paper);font:13px/1.4 system-ui,-apple-system,'Segoe UI','Helvetica Neue',Arial,sans-serif;
 font-variant-numeric:tabular-nums lining-nums;max-width:1060px;padding:2px 0 6px;container-type:inline-size}}
@media (prefers-color-scheme:dark){{.propkit-sheet{{{_DARK}}}}}
[data-jp-theme-light=true] .propkit-sheet{{{_LIGHT}}}
[data-jp-theme-light=false] .propkit-sheet{{{_DARK}}}
.propkit-sheet p{{margin:0}}
.propkit-sheet sub,.propkit-sheet sup{{line-height:0;font-size:.74em}}
.propkit-sheet .propkit-u{{color:var(--pk-quiet);font-size:12px}}
.propkit-strip{{display:flex;gap:0 .9em;align-items:baseline;flex-wrap:wrap;border-top:2px solid var(--pk-accent);border-bottom:1px solid var(--pk-line);padding:6px 2px 5px}}
.propkit-kind{{color:var(--pk-accent);font-weight:600;letter-spacing:.06em;text-transform:uppercase;font-size:11px}}
.propkit-title{{font-weight:600;font-size:14.5px;overflow-wrap:anywhere}}
.propkit-sub,.propkit-note,.propkit-legend{{color:var(--pk-quiet);font-size:12px;overflow-wrap:anywhere}}
.propkit-answers{{display:flex;flex-wrap:wrap;gap:4px 40px;padding:10px 2px 9px}}
.propkit-answer>b{{font-size:26px;font-weight:500;letter-spacing:-.01em}}
.propkit-answer>b small{{font-size:17px;font-weight:400}}
.propkit-answer>span:first-child{{display:block;color:var(--pk-quiet);font-size:12px}}
.propkit-flag{{color:var(--pk-doubt)}}
.propkit-body{{display:grid;grid-template:'left right pic' auto/minmax(0,.95fr) minmax(0,1.1fr) minmax(0,310px);gap:2px 32px;border-top:1px solid var(--pk-line);padding-top:5px;align-items:start}}
.propkit-two{{grid-template:'left right' auto 'pic right' 1fr/minmax(0,1fr) minmax(0,1.15fr)}}
.propkit-picright{{grid-template-columns:minmax(0,1.1fr) minmax(0,1fr) minmax(0,310px)}}
.propkit-two.propkit-picright{{grid-template:'left right' auto 'left pic' 1fr/minmax(0,1.1fr) minmax(0,1fr)}}
.propkit-left{{grid-area:left}}
.propkit-right{{grid-area:right}}
.propkit-pic{{grid-area:pic}}
.propkit-sheet .propkit-alone{{display:block}}.propkit-alone .propkit-pic{{display:flex;flex-wrap:wrap;gap:0 16px}}.propkit-alone img{{flex:0 1 360px;min-width:0}}
.propkit-sheet table{{border-collapse:collapse;width:100%;margin:0 0 6px;font-size:13px;border:0;color:inherit;background:none;table-layout:auto}}
.propkit-sheet caption,.propkit-caption{{caption-side:top;text-align:left;color:var(--pk-quiet);font-size:11px;font-weight:400;letter-spacing:.06em;text-transform:uppercase;padding:6px 0 2px}}
.propkit-sheet table.propkit-slim{{width:auto;min-width:45%}}
.propkit-sheet tr,.propkit-sheet tbody tr:hover,.propkit-sheet tbody tr:nth-child(odd),.propkit-sheet tbody tr:nth-child(even){{background:none}}
.propkit-sheet th,.propkit-sheet td{{border:0;border-bottom:1px solid color-mix(in srgb,var(--pk-line) 50%,transparent);padding:2.5px 5px;text-align:left;font-weight:400;vertical-align:baseline;white-space:normal;max-width:none}}
.propkit-sheet thead th{{border-bottom:1px solid var(--pk-line);vertical-align:bottom;line-height:1.25}}
.propkit-sheet th:first-child,.propkit-sheet td:first-child{{padding-left:0}}
.propkit-sheet .propkit-n{{text-align:right;white-space:nowrap}}
.propkit-n>span{{display:inline-block;text-align:left}}
.propkit-sheet .propkit-s,.propkit-sheet td.propkit-u{{white-space:nowrap}}
.propkit-sheet .propkit-t{{overflow-wrap:anywhere}}
.propkit-sheet .propkit-m{{width:11px;color:var(--pk-quiet);font-size:9px;padding-right:2px}}
.propkit-given .propkit-m,.propkit-given .propkit-n,.propkit-given .propkit-t{{color:var(--pk-accent)}}
.propkit-default .propkit-n,.propkit-default .propkit-t{{color:var(--pk-quiet)}}
.propkit-doubt{{color:var(--pk-doubt);font-size:12px;border-left:2px solid var(--pk-doubt);padding:0 0 0 8px;margin:2px 0 6px}}
.propkit-sheet p.propkit-doubt{{margin:1px 0 7px}}
.propkit-wide{{overflow-x:auto}}
.propkit-wide tbody th{{white-space:nowrap}}
.propkit-sheet .propkit-mid td,.propkit-sheet .propkit-mid tbody th{{vertical-align:middle}}
.propkit-pic img{{width:100%;height:auto;max-width:420px;display:block;margin:7px 0;filter:var(--pk-pic);border-radius:3px}}
.propkit-parts{{display:grid;grid-template-columns:repeat(auto-fit,minmax(min(320px,100%),1fr));grid-auto-flow:dense;gap:2px 36px;align-items:start}}
.propkit-parts>div{{min-width:0}}
.propkit-parts>.propkit-full{{grid-column:1/-1}}
.propkit-sheet .propkit-lines{{margin:0 0 6px;padding:0 0 0 1.1em;list-style:disc}}
.propkit-lines li{{margin:1px 0;break-inside:avoid}}
.propkit-long{{columns:2 330px;column-gap:36px}}
.propkit-sheet .propkit-bar{{width:24%;padding:0 14px 0 6px;vertical-align:middle}}
.propkit-n:has(+.propkit-bar){{width:1%}}
.propkit-pic .propkit-bar{{width:45%;padding-right:0}}
.propkit-bar>span{{display:block;height:8px;background:var(--pk-bar)}}
.propkit-step{{padding:7px 2px;border-bottom:1px solid color-mix(in srgb,var(--pk-line) 50%,transparent)}}
.propkit-steptitle{{font-weight:600}}
.propkit-step code{{font-size:12px;background:none;color:inherit;white-space:pre-wrap;overflow-wrap:anywhere}}
.propkit-eq{{padding:3px 0}}
.propkit-eq img{{max-width:100%;height:auto;display:block;margin:0;filter:var(--pk-eq);mix-blend-mode:var(--pk-blend)}}
.propkit-cautions b{{font-weight:600}}
@container (max-width:930px){{.propkit-body,.propkit-two{{grid-template:'left right' auto 'pic right' 1fr/minmax(0,1fr) minmax(0,1.15fr);gap:2px 28px}}
 .propkit-picright,.propkit-two.propkit-picright{{grid-template:'left right' auto 'left pic' 1fr/minmax(0,1.1fr) minmax(0,1fr)}}}}
@container (max-width:860px){{.propkit-sheet .propkit-wide table{{font-size:12px}}.propkit-sheet .propkit-wide th,.propkit-sheet .propkit-wide td{{padding:2.5px 3px}}
 .propkit-sheet .propkit-wide th:first-child{{padding-left:0}}.propkit-wide tbody th{{white-space:normal}}.propkit-sheet .propkit-wide .propkit-u{{font-size:11px}}}}
@container (max-width:540px){{.propkit-sheet .propkit-body{{grid-template:'left' auto 'right' auto 'pic' auto/minmax(0,1fr)}}
 .propkit-answers{{gap:4px 24px}}.propkit-answer>b{{font-size:21px}}.propkit-sheet .propkit-bar{{padding:0 4px 0 2px}}}}
@media print{{.propkit-sheet,[data-jp-theme-light] .propkit-sheet{{--pk-ink:#000;--pk-quiet:#444;--pk-line:#999;--pk-accent:#000;--pk-doubt:#000;--pk-bar:#777;--pk-paper:#fff;
 --pk-pic:grayscale(1);--pk-eq:none;--pk-blend:normal;max-width:none;print-color-adjust:exact;-webkit-print-color-adjust:exact}}
 .propkit-wide{{overflow:visible}}.propkit-sheet .propkit-wide table{{font-size:10.5px}}.propkit-sheet .propkit-wide .propkit-u{{font-size:10px}}
 .propkit-sheet tr,.propkit-step,.propkit-pic,.propkit-answers{{break-inside:avoid}}.propkit-given .propkit-n,.propkit-given .propkit-t{{font-weight:600}}}}
"""

STYLE = re.sub(r"\s*\n\s*", "", _CSS)
"""The style sheet in one line."""
