"""Whole runs of studies whose Sobol' indices, and all that follows from them, are known."""
