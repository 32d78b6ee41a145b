"""Sections of the report, each from the review to its blocks.

upper.py     the upper edge: budget, time constants, shares, the way from paper to simulation, causes, what would help
response.py  the response: over frequency, at single frequencies, its peaking, and beside a measured curve
feedback.py  unity gain and feedback: margins, who uses up the phase, what it takes, return ratios
ports.py     drive and output: what drives and loads, large signals, both modes, further outputs, impedances
circuit.py   the circuit: lower edge, stages, devices, poles and zeros
evidence.py  what the numbers rest on: what was changed, own figures, netlist lines, proof, agreement
"""
