"""The devices room: what each element is in the small-signal network.

family.py     the contract of a device family
parts.py      the labelled primitives that everything downstream works on
passives.py, sources.py, controlled.py with polynomial.py, coupling.py, switches.py    linear elements
diode.py, gummel_poon.py    exact from readings
field_effect.py    what FETs have in common; meyer.py, bsim.py, jfet.py, vdmos.py    exact from readings
fitted.py with fit.py and reduced.py    everything else that is fitted, from one instance measured alone
behavioural.py with derivative.py    formulas, differentiated at the operating point
catalogue.py  all families, which of them takes an element, and the walk over a circuit

Public: `catalogue.FAMILIES`, `catalogue.choose`, `catalogue.observations`, `catalogue.isolations`,
`catalogue.linearise`.
"""
