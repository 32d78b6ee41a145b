"""The network room: labelled parts in, exact numbers out; it knows neither netlist nor engine nor device.

assemble.py    parts → G and C, drive b, output e; solve.py  Y x = b and Yᵀ λ = e at many frequencies at once
admittance.py  Y(s) and dY/ds with delays, and the all-pass that stands for a delay among poles
reactances.py  every reactive part as a rank-one term of C, which is all that shares, constants and owners need
spectrum.py    poles and zeros as numbers; poles.py  who owns them, which pairs cancel
midband.py     the reference; bands.py  short, open or tuned there, and the upper and the lower network
edges.py       −3 dB crossings; shares.py  whose capacitance sets them; recompute.py  the same with other values
constants.py   open-circuit time constants, weights, group delay; lower.py  short-circuit ones with their zeros
agreement.py   against the engine's sweep; identities.py  what must come out equal in every run

Public: `Network.from_parts`, `find_midband`, `classify`, `find_edges`, `find_poles`, `find_shares`, `each_scaled`,
`edge_frequencies`, `scaled`, `without`, `open_constants`, `midband_inverse`, `group_delay`, `short_constants`,
`agreement`, and the identities with `check`.
"""
