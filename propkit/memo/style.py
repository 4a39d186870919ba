"""The style sheet of memo pages: a calculation pad on screen, in print, light and dark."""

PAGE_STYLE = """
:root{--ink:#1d2733;--quiet:#5d6b78;--line:#c9d1d8;--paper:#fff;--wash:#f5f7f9;--accent:#b3481b;--bad:#8a6100}
*{box-sizing:border-box}
html{-webkit-text-size-adjust:100%;text-size-adjust:100%}
body{margin:0;background:var(--paper);color:var(--ink);font:16px/1.5 "Source Sans 3","Segoe UI",Roboto,"Helvetica Neue",Arial,"DejaVu Sans",sans-serif;
font-variant-numeric:tabular-nums lining-nums}
article{max-width:56rem;margin:0 auto;padding:1.6rem 1.2rem 3rem}
h1,h2,h3,h4{line-height:1.22;font-weight:600;margin:1.9em 0 .5em;break-after:avoid}
h1{font-size:1.62rem;margin:0}
h2{font-size:1.2rem}
h3,h4{font-size:1.02rem}
p,ul,ol{margin:.5em 0 .8em}
.prose p,.prose ul,.prose ol,section>p,section>ul{max-width:46rem}
article .propkit-sheet{font-family:inherit}
a{color:var(--accent)}
code,pre{font-family:"Source Code Pro",ui-monospace,Menlo,Consolas,"DejaVu Sans Mono",monospace;font-size:.85em}
.title-block{border-top:3px solid var(--accent);border-bottom:1px solid var(--line);padding:1rem 0 .9rem}
.title-block dl{display:grid;grid-template-columns:repeat(auto-fit,minmax(13rem,1fr));gap:.35rem 1.5rem;margin:.9rem 0 0;font-size:.9rem}
.title-block dt,.facts dt{color:var(--quiet);font-size:.78rem;letter-spacing:.02em}
.title-block dd{margin:0;overflow-wrap:anywhere}
.summary{border-bottom:1px solid var(--line);padding:.7rem 0}
.summary p{margin:.15rem 0;max-width:none}
.headline{font-size:1.22rem;font-weight:600}
.answers{display:flex;flex-wrap:wrap;gap:.2rem 2.4rem}
.answer{margin:.2rem 0}.answer span{display:block;color:var(--quiet);font-size:.85rem}.answer b{font-size:1.55rem;font-weight:500}
.rows td.mark{color:var(--accent);font-size:.7em;padding-right:.5rem}
td.unit{color:var(--quiet);padding-left:0}
.doubt{color:var(--bad);font-size:.88em}
.formula{padding:.3rem 0 .5rem;border-bottom:1px solid var(--line)}.formula p{margin:.2rem 0;max-width:none}.formula code{overflow-wrap:anywhere}
.display img{background:#fff;padding:2px 4px}
figure{margin:.8rem 0}.figures{display:flex;flex-wrap:wrap;gap:0 1.6rem}.figures figure{flex:1 1 20rem}figure img{max-width:26rem;width:100%;height:auto}
.trace td{font-size:.84rem}
.quiet{color:var(--quiet);font-size:.92rem}
.failure{border-left:3px solid var(--bad);padding:.4rem .8rem;color:var(--bad);overflow-wrap:anywhere;white-space:pre-wrap}
.output{margin:.8rem 0 1.2rem;overflow-x:auto}
.output img{max-width:100%;height:auto}
img.equation{max-width:none;background:#fff;border-radius:2px}
.display{margin:.8rem 0;overflow-x:auto}
table{border-collapse:collapse;font-size:.9rem;margin:.5rem 0 1rem}
th,td{padding:.22rem .8rem .22rem 0;border-bottom:1px solid var(--line);vertical-align:baseline;text-align:left}
th{font-weight:600;color:var(--quiet);border-bottom-color:var(--quiet)}
td.number,th.number,.dataframe td,.dataframe thead th{text-align:right;padding-left:.8rem}
.dataframe tbody th{color:inherit;font-weight:400;border-bottom-color:var(--line)}
.table-frame{overflow-x:auto}
.digest{font-family:"DejaVu Sans Mono",ui-monospace,Menlo,Consolas,monospace;font-size:.72rem;overflow-wrap:anywhere;min-width:9rem}
pre{overflow-x:auto;margin:0;line-height:1.42}
pre.printed{background:var(--wash);padding:.6rem .8rem}
.cautions{border-top:1px solid var(--line);margin-top:1.8rem;font-size:.9rem}
.appendix{font-size:.92rem}
.appendix .cell{display:grid;grid-template-columns:2rem 1fr;border-top:1px solid var(--line);padding:.5rem 0}
.appendix .cell pre{white-space:pre-wrap;overflow-wrap:anywhere}
.cell .number{color:var(--quiet);font-size:.8rem}
.k,.kn,.kc,.ow{font-weight:600}.c1,.ch,.cm,.sd{color:var(--quiet);font-style:italic}.s1,.s2,.sa,.si{color:var(--accent)}
tr,img,.summary,.title-block,.formula,.cautions{break-inside:avoid}
@media (prefers-color-scheme:dark){:root{--ink:#e4e8ee;--quiet:#9aa6b5;--line:#3a4452;--paper:#161b22;--wash:#1e252e;--accent:#f0905f;--bad:#e9bd57}
img.equation{padding:2px 4px}}
@media (max-width:40rem){article{padding:1rem .8rem 2rem}body{font-size:15px}h1{font-size:1.35rem}}
@page{margin:18mm 16mm 20mm}
@media print{html{font-size:10.5pt}:root{--ink:#000;--quiet:#444;--line:#bbb;--paper:#fff;--wash:#fff;--accent:#b3481b}
body{font-size:1rem}article{max-width:none;padding:0}.output,.table-frame,.display,pre{overflow:visible}pre{white-space:pre-wrap}
pre.printed{padding:0;border-left:2px solid var(--line);padding-left:.6rem}a{color:inherit;text-decoration:none}thead{display:table-header-group}
table:not(:has(tbody tr:nth-child(14))),figure,.propkit-body,.propkit-step{break-inside:avoid}.prose,.propkit-strip,.propkit-answers,.propkit-caption,.propkit-steptitle,section>p:has(+.table-frame),section>p:has(+table){break-after:avoid}}
"""
