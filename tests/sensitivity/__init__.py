"""Indices of sensitivity against closed forms, published values and general-purpose libraries."""
