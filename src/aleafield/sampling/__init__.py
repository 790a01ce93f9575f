"""How many samples, in which order and in which chunks; the solver is known only as a forward model."""
