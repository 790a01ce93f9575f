"""Projectors, methods and quadratures paired: a field equation becomes a semi-discrete system."""
