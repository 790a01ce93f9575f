"""The allow-listed formula language: data, never code.

A formula is parsed to a syntax tree that admits numbers, names, arithmetic, comparison and calls of a fixed
list of functions, and is evaluated on arrays. Nothing is ever handed to the Python interpreter.
"""

from aleafield.formula.expression import Formula, constant, order_of
from aleafield.formula.language import CONSTANTS, FUNCTIONS, LAW_NAMES, RESERVED, nearest_name

__all__ = [
    "CONSTANTS",
    "FUNCTIONS",
    "LAW_NAMES",
    "RESERVED",
    "Formula",
    "constant",
    "nearest_name",
    "order_of",
]
