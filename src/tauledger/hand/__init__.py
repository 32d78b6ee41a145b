"""The hand side: what an engineer writes on paper, worked, with the exact value beside every line.

equivalent.py draws the mid-band circuit out of elements.py (resistors, cells). rules/ has the looking-in rules,
branches.py applies them, looking_in.py checks each result against the exact resistance. miller.py splits the
capacitances; nodes.py and roles.py name things and test the path; budget.py, lower.py and stages.py make the rows.
From the rows come the steps from paper to the full network, the classical methods and the hand poles. estimate.py has
the records. compensated.py finds a compensated stage, compensation.py has its formulas, roots.py tells which pole or
zero each belongs to. Nothing here imports netlist or engine.
"""
