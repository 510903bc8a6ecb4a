"""The report: one self-contained HTML file about a run, for the screen and for A4 paper."""
