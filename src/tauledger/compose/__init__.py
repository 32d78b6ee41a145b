"""Explained numbers → the Review record.

review.py   the record as a whole: mid-band, edges, estimates, steps
rows.py     its tables: nodes, parts, budget, poles and zeros
setting.py  what surrounds the numbers: drive, load, devices, curves, lines of the netlist, cautions

Public: `review.compose`.
"""
