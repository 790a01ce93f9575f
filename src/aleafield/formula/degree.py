"""The degree of a formula as a polynomial in one of its names, told from its structure."""

from __future__ import annotations

import ast
import math
from collections.abc import Mapping


def degree(tree: ast.expr, degrees: Mapping[str, float]) -> float:
    """0, 1, 2, .. or inf, from the degrees of the names; a name that is not among them is free of the variable.

    Sums have the higher degree, products the sum, quotients that of the dividend where the divisor is free of the
    variable, powers with a whole exponent that many times the degree of the base; `where` has the higher degree
    of its branches where its condition is free of the variable.  Whatever else holds the variable is no
    polynomial.  Nothing is simplified: u - u has degree 1, and u**2 / u infinity.
    """
    if isinstance(tree, ast.Name):
        return degrees.get(tree.id, 0.0)
    if isinstance(tree, ast.UnaryOp):
        return degree(tree.operand, degrees)
    if isinstance(tree, ast.BinOp):
        return _of_operation(tree, degrees)
    if isinstance(tree, ast.Compare):
        return _of_function([tree.left, *tree.comparators], degrees)
    if isinstance(tree, ast.Call):
        name = tree.func.id if isinstance(tree.func, ast.Name) else ""
        if name == "where" and degree(tree.args[0], degrees) == 0.0:
            return max(degree(branch, degrees) for branch in tree.args[1:])
        return _of_function(tree.args, degrees)
    return 0.0


def _of_operation(tree: ast.BinOp, degrees: Mapping[str, float]) -> float:
    left, right = degree(tree.left, degrees), degree(tree.right, degrees)
    if isinstance(tree.op, ast.Add | ast.Sub):
        return max(left, right)
    if isinstance(tree.op, ast.Mult):
        return left + right
    if right != 0.0:
        return math.inf
    if isinstance(tree.op, ast.Div) or left == 0.0:
        return left
    exponent = _whole(tree.right)
    if exponent is None:
        return math.inf
    return left * exponent if exponent else 0.0


def _of_function(arguments: list[ast.expr], degrees: Mapping[str, float]) -> float:
    free = all(degree(argument, degrees) == 0.0 for argument in arguments)
    return 0.0 if free else math.inf


def _whole(tree: ast.expr) -> int | None:
    """The value of an exponent that is written as a whole number, not negative; None for any other."""
    if not isinstance(tree, ast.Constant) or not isinstance(tree.value, int | float):
        return None
    return int(tree.value) if tree.value == int(tree.value) else None
