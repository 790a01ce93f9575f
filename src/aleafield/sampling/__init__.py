"""How many samples are drawn, and how; the solver is known only as a forward model."""
