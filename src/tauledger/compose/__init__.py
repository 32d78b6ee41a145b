"""Explained numbers → the Review record.

review.py   the record as a whole: mid-band, edges, estimates, steps
rows.py     its tables: nodes, parts, budget, poles and zeros
setting.py  what surrounds the numbers: drive, load, devices, curves, lines of the netlist, cautions
helps.py    what 10 % less of each element does; aids.py  what stands there for the sake of a measurement
changed.py  the headline before and after a change; devices.py  the table of devices alone

Public: `review.compose`.
"""
