"""The page, its figures, the lines for a terminal and the table for a notebook.

Everything here reads records and statements and computes none: histograms are counted, axes get their ticks
and numbers are rounded to the digits they earned.
"""
