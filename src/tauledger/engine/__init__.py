"""The engine room: a circuit goes in, ngspice's operating point and sweep come out.

deck.py      Circuit → deck text in generated names, by whitelist
formula.py   a formula as text, by whitelist
alone.py     instances measured alone: their circuit, the question, and the answers put together
grid.py      which frequencies ngspice lays out itself, and which it is asked one by one
protocol.py  frames of JSON on the pipes between parent and worker
worker.py    the process that holds ngspice: the only file that imports PySpice
verdict.py   what the engine's lines and results mean, in the user's names
client.py    the parent's side: start, ask, deadline, end

Public: `client.start_engine`, `client.Engine`, `grid.decades`.
"""
