"""The report room: a Review becomes one file per format; renderers get the Review and nothing else.

json.py, csv.py   every number, by the names of the document `tauledger.review/1`
terminal.py       the page of text: its sections stand in the files of this folder, layout.py makes lines of them
document.py       the report for reading, sections/ of tables/, charts/ and drawing/; html.py, markdown.py print it
wording.py        how things are named and numbers written, marks.py, sentences.py, terms.py: in all formats alike

The room imports only record and quantity; rich is imported by terminal.py alone, and only for colour.
"""
