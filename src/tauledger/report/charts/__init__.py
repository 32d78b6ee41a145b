"""Charts of the report as SVG: deterministic, text as text, colours as CSS variables.

style.py   colours, line styles, the figure and how it becomes SVG
bars.py    time constants and shares, one bar or two per capacitance
way.py     estimates of f_H as a stepped line
bode.py    magnitude and phase
plane.py   poles and zeros
"""
