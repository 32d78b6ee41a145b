"""Why hand and simulation differ, and what must be known of the numbers.

`evidence.Evidence` is all that a cause may look at. Each cause is a function Evidence → Cause or None in a file of its
own, its effect the ratio of two steps or of a method and the exact edge; notes, which have no effect in per cent, are
in `notes`. `catalogue` lists both and gives `find_causes` and `find_notes`.

Imports records, devices, network and hand; never netlist or engine.
"""
