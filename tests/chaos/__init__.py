"""Polynomial chaos against closed forms, quadrature and published indices."""
