"""The report's own style sheet: dark text on white, A4 when printed, readable on a phone."""

CSS = """
*{box-sizing:border-box}
html{-webkit-text-size-adjust:100%}
body{margin:0 auto;max-width:210mm;padding:10mm 15mm 15mm;background:#fff;color:#1a1a1a;
 font:10.5pt/1.45 "Source Sans 3","Segoe UI",Roboto,"Helvetica Neue",Arial,sans-serif}
h1{font-size:19pt;line-height:1.2;margin:0 0 2mm}
h2{font-size:13.5pt;margin:9mm 0 2.5mm;padding-bottom:1mm;border-bottom:.4mm solid #1a1a1a;break-after:avoid}
h3{font-size:11pt;margin:5mm 0 1.5mm;break-after:avoid}
p{margin:0 0 2.5mm}
p.intro{break-after:avoid;break-inside:avoid}
.keep{break-inside:avoid}
.lead{color:#444;margin-bottom:3mm}
.verdict{display:flex;flex-wrap:wrap;gap:2mm;margin:0 0 3mm}
.badge{border:.35mm solid #1a1a1a;border-radius:1mm;padding:.8mm 2.6mm;font-weight:600}
.badge.met{background:#1d4a52;border-color:#1d4a52;color:#fff}
.badge.missed{background:#fff;border-color:#8a1f11;color:#8a1f11;border-width:.6mm}
.note{border-left:1.2mm solid #6b6b6b;background:#f5f5f5;padding:2mm 3mm;margin:0 0 3mm;break-inside:avoid}
.note.danger{border-color:#8a1f11;background:#fbf1ef}
.note ul{margin-bottom:0}
.wide{overflow-x:auto;margin:0 0 3mm}
table{break-inside:avoid;border-collapse:collapse;width:100%;font-size:9.5pt;line-height:1.3}
th{text-align:left;font-weight:600;border-bottom:.3mm solid #1a1a1a;padding:1mm 1.6mm;vertical-align:bottom}
th.group{text-align:center;border-bottom:.2mm solid #999;font-weight:400}
td{padding:.9mm 1.6mm;border-top:.15mm solid #ccc;vertical-align:top}
table.requirements td,table.requirements th{padding-left:1.2mm;padding-right:1.2mm}
table.requirements td{border-top-color:transparent}
table.requirements tr.first td{border-top-color:#bbb;padding-bottom:0}
table.requirements td.small{padding-left:4mm;white-space:nowrap}
th.number{text-align:right}
td.number{text-align:right;white-space:nowrap;font-variant-numeric:tabular-nums}
tr{break-inside:avoid}
.yes{color:#1d4a52;font-weight:600;white-space:nowrap}
.no{color:#8a1f11;font-weight:700;white-space:nowrap}
.small{font-size:9pt;color:#444}
figure{margin:0 0 4mm;break-inside:avoid}
figcaption{font-size:9.5pt;color:#333;margin-top:1mm}
svg text{font-family:"DejaVu Sans","Segoe UI",Roboto,Arial,sans-serif}
svg.plot{display:block;width:100%;height:auto}
.faces{display:flex;flex-wrap:wrap;gap:4mm 6mm;align-items:flex-start}
.faces figure{max-width:100%}
.scroll{overflow-x:auto;max-width:100%}
svg.face,svg.legend{display:block;flex:none}
svg.legend{max-width:100%;height:auto}
ul{margin:0 0 3mm;padding-left:5mm}
li{margin-bottom:1.2mm}
ul.assembly li.danger{color:#6d180d}
dl{display:grid;grid-template-columns:max-content 1fr;gap:.6mm 4mm;margin:0 0 3mm}
dt{color:#444}dd{margin:0;overflow-wrap:anywhere}
pre{font:8.5pt/1.35 ui-monospace,"DejaVu Sans Mono",Consolas,monospace;background:#f5f5f5;padding:3mm;margin:0 0 3mm;
 overflow-x:auto;white-space:pre-wrap;overflow-wrap:anywhere}
footer{margin-top:8mm;border-top:.2mm solid #999;padding-top:2mm;font-size:9pt;color:#444}
@media (max-width:600px){body{padding:4mm}h1{font-size:16pt}dl{grid-template-columns:1fr}dt{margin-top:1mm}
 svg.plot{min-width:480px}.plotbox{overflow-x:auto}}
@page{size:A4;margin:14mm 15mm}
@media print{body{padding:0;max-width:none;font-size:10pt}.page{break-before:page}.wide,.scroll{overflow:visible}
 *{-webkit-print-color-adjust:exact;print-color-adjust:exact}}
"""
