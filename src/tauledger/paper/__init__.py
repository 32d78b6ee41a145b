"""The designer's own page: figures from paper, set beside hand and exact, and the slip that explains a wrong one.

page.py reads a page (TOML text, no file), keys.py names the figures of devices on it, empty.py writes an empty one for
a circuit. bench.py works the circuit again with one thing changed, slips.py lists the known slips, series.py those of
series and parallel; compare.py sets every figure beside hand and exact and names the slip that reproduces it. A page's
figures cross to the review as `record.PaperFigure`.
"""
