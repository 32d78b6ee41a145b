"""Equivalent circuits as SVG: symbols after IEC 60617, and one drawing per stage with values at every element."""
