"""Answers beyond the band edges: one file per question, each from the numbers to its facts in the review.

answer.py           adds them one after the other, and says what an answer is taken from
unity.py            f_u and margins, with simulated_unity.py, unity_shares.py, phase_budget.py
at.py, peaking.py   gain and phase at a frequency, and the peak
wants.py            what a wanted figure takes, with figures.py, remedies.py, changed_circuit.py
loop.py             return ratios, with loop_places.py, loop_says.py, double_injection.py, macromodel.py
curve.py            a measured curve, with curve_file.py, stray.py, stray_rerun.py
modes.py, outputs.py, impedances.py, large_signal.py, miller.py  what their names say
elements.py         the elements that several of them rank

Public: `answer.answer`.
"""
