"""Probability laws of inputs, their dependence, and counter-based streams of random numbers."""
