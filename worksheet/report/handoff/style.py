"""The look of a page on screen and on paper. Colours keep a contrast of 4.5 to 1 against the ground (WCAG 2.2, AA)."""

SHEET = """
:root{color-scheme:light}
*{box-sizing:border-box}
html{font-size:16px}
body{margin:0;color:#1b1f23;background:#fff;font:1rem/1.5 system-ui,"Helvetica Neue",Arial,sans-serif}
main,footer{max-width:68rem;margin:0 auto;padding:1rem 1.5rem}
footer{color:#4a5258;border-top:1px solid #b9c0c6;font-size:.875rem}
.skip{position:absolute;left:-99rem}
.skip:focus{position:static;display:inline-block;padding:.5rem 1rem}
a{color:#0b4f8a}
h1{font-size:1.75rem;line-height:1.2;margin:.5rem 0}
h2{font-size:1.3rem;margin:2.2rem 0 .6rem;padding-top:.4rem;border-top:2px solid #1b1f23}
h3{font-size:1.1rem;margin:1.6rem 0 .5rem}
h4{font-size:1rem;margin:1.2rem 0 .4rem}
p,ul{margin:.5rem 0;max-width:52rem;overflow-wrap:break-word}
.strong{font-weight:600}
.quiet{color:#4a5258;font-size:.875rem}
nav ul{list-style:none;padding:0;columns:16rem}
nav li{break-inside:avoid}
.wide{overflow-x:auto;margin:.6rem 0}
table{border-collapse:collapse;font-size:.875rem;line-height:1.35}
caption{text-align:left;font-weight:600;padding:.2rem 0}
th,td{text-align:left;vertical-align:top;padding:.25rem .7rem .25rem 0;border-bottom:1px solid #d3d8dc;
overflow-wrap:break-word;max-width:24rem}
thead th{border-bottom:2px solid #1b1f23;vertical-align:bottom}
tbody th{font-weight:600}
.one{white-space:nowrap}
.right{text-align:right;white-space:nowrap}
td.right,th.right{padding-left:.4rem}
data{white-space:nowrap;font-variant-numeric:tabular-nums}
.met{color:#1d6131}.missed{color:#a3131b;font-weight:700}.unknown{color:#7a4a00;font-weight:700}
.waived{color:#5b3a91;font-weight:600}
figure{margin:1rem 0}
figcaption{font-size:.875rem;color:#33393e}
img{max-width:100%;height:auto;display:block}
pre{font:.8125rem/1.35 ui-monospace,"DejaVu Sans Mono",Menlo,Consolas,monospace;overflow-x:auto;background:#f4f6f7;
padding:.7rem;margin:.4rem 0}
.paper{display:none}
.formula{border-left:3px solid #b9c0c6;padding-left:.9rem}
.formula figcaption{font-weight:600;color:#1b1f23}
math{margin:.5rem 0;width:fit-content;font-size:1.05rem}
@page{size:A4;margin:15mm 14mm 17mm}
@media print{
html{font-size:9.5pt}
body{line-height:1.35}
main,footer{max-width:none;padding:0}
.skip{display:none}
a{color:inherit;text-decoration:none}
h1{font-size:17pt}h2{font-size:12.5pt;margin:14pt 0 4pt}h3{font-size:10.5pt;margin:10pt 0 3pt}h4{font-size:9.5pt}
h1,h2,h3,h4,caption,.lines figcaption,.formula figcaption{break-after:avoid}
.page{break-before:page}
p,li{orphans:3;widows:3;max-width:none}
.wide,pre{overflow:visible}
table{font-size:7.5pt}
.screen{display:none}
.keep,.short{break-inside:avoid}
th,td{max-width:none;padding-right:5pt}
thead{display:table-header-group}
tr,figure,img,math{break-inside:avoid}
pre{white-space:pre-wrap;font-size:7.5pt;border:1px solid #d3d8dc;background:none}
math{font-size:10pt}
math.small{font-size:7.6pt}
math.smaller{font-size:6pt}
.paper{display:block}
img{max-height:150mm}
}
"""
