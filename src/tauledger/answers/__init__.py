"""Answers beyond the band edges: one file per question, each from the numbers to its facts in the review."""
