"""Plain records that the two halves of the package share, and the protocol of a forward model.

The lower half turns an equation into numbers for given sample indices; the upper half turns numbers into
statements with errors.  Everything above the solver sees only: *evaluate a level on sample indices*.
"""
