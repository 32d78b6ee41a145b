"""The commands, one file each: options → pipeline → report. Only what `--help` needs is imported at the top of a file.

console.py   what all of them share: standard output, files written whole, colour, numbers as options
"""
