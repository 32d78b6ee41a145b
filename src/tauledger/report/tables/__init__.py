"""Tables for reading, as data: what HTML and Markdown both print.

grid.py     the record of a table
upper.py    time-constant budget, time constant and share of every capacitance
working.py  one signal node worked out
helps.py    what 10 % less of one element does to edges and gain
lower.py    coupling and bypass capacitors
roots.py    poles and zeros with the names that charts and table share
unity.py    unity gain, who sets it; phase.py  degrees used by poles and zeros there, exact and by hand
loop.py     a return ratio and what it makes of the closed gain
at.py       gain and phase at a frequency, peaking; curve.py  a measured curve
modes.py    differential and common mode, further outputs; impedances.py; large_signal.py
wants.py    what a wanted figure takes
way.py      estimates from the lowest node to the simulation, methods, what was recomputed
outside.py  figures of a page of one's own, values set
setting.py  drive and load, stages, devices, lines of the netlist, versions
"""
