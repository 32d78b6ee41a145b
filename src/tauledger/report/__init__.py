"""The report room: a Review becomes one file per format; renderers get the Review and nothing else.

json.py writes the document `tauledger.review/1` and its schema. terminal.py writes the page of text. Its sections are
summary (what was reviewed, band, bias), upper (budget, shares), steps, lower, poles, and reasons (warning, causes,
closing); wording.py says how things are named and numbers written; layout.py makes lines of tables and prose.
The room imports only record and quantity; rich is imported by terminal.py alone, and only for colour.
"""
