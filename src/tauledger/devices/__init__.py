"""The devices room: what each element is in the small-signal network.

family.py     the contract of a device family
parts.py      the labelled primitives that everything downstream works on
passives.py, sources.py, controlled.py, gummel_poon.py    one file per family
catalogue.py  all families, and the walk over a circuit

Public: `catalogue.FAMILIES`, `catalogue.family_of`, `catalogue.observations`, `catalogue.linearise`.
"""
