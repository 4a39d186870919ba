"""The style sheet of a sheet: small, scoped, themed through Jupyter's variables, grey in print."""

from __future__ import annotations

import re

from propkit.view import palette

_DARK = (
    f"--pk-accent:{palette.ACCENT_DARK};--pk-doubt:{palette.DOUBT_DARK};--pk-bar:{palette.BAR_DARK};--pk-ink:var(--jp-content-font-color1,#e4e8ec);"
    "--pk-quiet:var(--jp-content-font-color2,#a7b2bd);--pk-line:var(--jp-border-color2,#46525e);--pk-paper:var(--jp-layout-color1,#15191e)"
)
_LIGHT = (
    f"--pk-accent:{palette.ACCENT};--pk-doubt:{palette.DOUBT};--pk-bar:{palette.SERIES[0]};--pk-ink:var(--jp-content-font-color1,{palette.INK});"
    f"--pk-quiet:var(--jp-content-font-color2,{palette.QUIET});--pk-line:var(--jp-border-color2,{palette.HAIRLINE});--pk-paper:var(--jp-layout-color1,#fff)"
)

_CSS = f"""
.propkit-sheet{{{_LIGHT};color:var(--pk-ink);background:var(--pk-paper);font:13px/1.45 system-ui,'Helvetica Neue',Arial,sans-serif;
 font-variant-numeric:tabular-nums lining-nums;max-width:1080px;padding:2px 0 6px;container-type:inline-size}}
@media (prefers-color-scheme:dark){{.propkit-sheet{{{_DARK}}}}}
[data-jp-theme-light=true] .propkit-sheet{{{_LIGHT}}}
[data-jp-theme-light=false] .propkit-sheet{{{_DARK}}}
.propkit-sheet p{{margin:0}}
.propkit-sheet sub,.propkit-sheet sup{{line-height:0;font-size:.74em}}
.propkit-strip{{display:flex;gap:.9em;align-items:baseline;flex-wrap:wrap;border-top:2.5px solid var(--pk-accent);border-bottom:1px solid var(--pk-line);padding:5px 2px}}
.propkit-kind{{color:var(--pk-accent);font-weight:600;letter-spacing:.05em;text-transform:uppercase;font-size:11px}}
.propkit-title{{font-weight:600;font-size:14.5px;overflow-wrap:anywhere}}
.propkit-sub,.propkit-note,.propkit-legend{{color:var(--pk-quiet);font-size:12px;overflow-wrap:anywhere}}
.propkit-answers{{display:flex;flex-wrap:wrap;gap:4px 38px;padding:10px 2px 8px}}
.propkit-answer b{{font-size:25px;font-weight:500;letter-spacing:-.01em}}
.propkit-answer span{{display:block;color:var(--pk-quiet);font-size:12px}}
.propkit-body{{display:grid;grid-template-columns:minmax(215px,.8fr) minmax(265px,1.05fr) minmax(0,360px);gap:4px 30px;border-top:1px solid var(--pk-line);padding-top:6px;align-items:start}}
.propkit-sheet table{{border-collapse:collapse;width:100%;margin:0 0 4px;font-size:13px;border:0;color:inherit;background:none}}
.propkit-sheet caption{{caption-side:top;text-align:left;color:var(--pk-quiet);font-size:11px;letter-spacing:.05em;text-transform:uppercase;padding:5px 0 2px}}
.propkit-sheet tr,.propkit-sheet tr:hover,.propkit-sheet tr:nth-child(even){{background:none}}
.propkit-sheet th,.propkit-sheet td{{border:0;border-bottom:1px solid color-mix(in srgb,var(--pk-line) 55%,transparent);padding:2.5px 5px;text-align:left;font-weight:400;vertical-align:baseline;white-space:normal}}
.propkit-sheet thead th{{border-bottom:1px solid var(--pk-line);vertical-align:bottom;line-height:1.25}}
.propkit-sheet .propkit-n{{text-align:right;white-space:nowrap}}
.propkit-sheet .propkit-s{{white-space:nowrap}}
.propkit-sheet .propkit-u,.propkit-sheet thead .propkit-u{{color:var(--pk-quiet);white-space:nowrap;font-size:12px}}
.propkit-sheet .propkit-m{{width:1em;color:var(--pk-quiet);font-size:9px;padding-left:0}}
.propkit-given .propkit-m,.propkit-given .propkit-n{{color:var(--pk-accent)}}
.propkit-default .propkit-n{{color:var(--pk-quiet)}}
.propkit-doubt{{color:var(--pk-doubt);font-size:12px;border-left:2.5px solid var(--pk-doubt);padding-left:7px;margin:2px 0}}
.propkit-sheet .propkit-wide{{overflow-x:auto}}
.propkit-pic img{{width:100%;height:auto;max-width:420px;display:block;margin:5px 0}}
.propkit-parts{{display:grid;grid-template-columns:repeat(auto-fit,minmax(min(340px,100%),1fr));gap:0 34px;align-items:start}}
.propkit-parts>div{{min-width:0}}
.propkit-parts>.propkit-full{{grid-column:1/-1;min-width:0}}
.propkit-lines{{margin:0;padding:0 0 0 1.1em}}
.propkit-lines li{{margin:1px 0;break-inside:avoid}}
.propkit-full .propkit-lines{{columns:2 340px;column-gap:34px}}
.propkit-bar{{display:inline-block;height:.62em;background:var(--pk-bar);opacity:.85;vertical-align:baseline;min-width:1px}}
.propkit-sheet .propkit-barcell{{width:34%}}
.propkit-step{{padding:6px 2px;border-bottom:1px solid color-mix(in srgb,var(--pk-line) 55%,transparent)}}
.propkit-steptitle{{font-weight:600}}
.propkit-step code{{font-size:12px;background:none;color:inherit;white-space:pre-wrap;overflow-wrap:anywhere}}
td .propkit-eq{{margin:0}}
.propkit-eq{{background:{palette.PLATE};border-radius:3px;padding:4px 8px;margin:3px 0;display:inline-block;max-width:100%}}
.propkit-eq img{{max-width:100%;display:block}}
@container (max-width:900px){{.propkit-body{{grid-template-columns:minmax(0,1fr) minmax(0,1.2fr)}}.propkit-pic{{grid-column:1/-1}}}}
@container (max-width:560px){{.propkit-body{{grid-template-columns:minmax(0,1fr)}}.propkit-answers{{gap:4px 24px}}.propkit-answer b{{font-size:21px}}}}
@media print{{.propkit-sheet{{--pk-ink:#000;--pk-quiet:#444;--pk-line:#999;--pk-accent:#000;--pk-doubt:#000;--pk-paper:#fff;max-width:none;font-size:10.5px;break-inside:auto}}
 .propkit-sheet tr,.propkit-step,.propkit-pic{{break-inside:avoid}}.propkit-pic img{{filter:grayscale(1)}}}}
"""

STYLE = re.sub(r"\s*\n\s*", "", _CSS)
"""The style sheet in one line."""
