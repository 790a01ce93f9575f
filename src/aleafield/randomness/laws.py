"""The laws by name, and their reading from the strings of a study file."""

from __future__ import annotations

import ast
import re
from pathlib import Path

from aleafield.errors import InputError
from aleafield.formula import LAW_NAMES, constant
from aleafield.formula.parser import read_tree, shown
from aleafield.randomness.continuous import (
    Beta,
    Exponential,
    Gamma,
    LogNormal,
    LogUniform,
    Normal,
    Triangular,
    Uniform,
)
from aleafield.randomness.discrete import Discrete
from aleafield.randomness.law import Law
from aleafield.randomness.sampled import Sampled, read_column
from aleafield.randomness.truncated import TruncatedNormal

__all__ = [
    "LAWS",
    "LAW_NAMES",
    "Beta",
    "Discrete",
    "Exponential",
    "Gamma",
    "Law",
    "LogNormal",
    "LogUniform",
    "Normal",
    "Sampled",
    "Triangular",
    "TruncatedNormal",
    "Uniform",
    "parse_law",
]

LAWS: dict[str, type[Law]] = {
    law.name: law
    for law in (
        Uniform,
        Normal,
        TruncatedNormal,
        LogNormal,
        LogUniform,
        Triangular,
        Beta,
        Gamma,
        Exponential,
        Discrete,
        Sampled,
    )
}
"""The laws by the word that a study file uses."""

LONGEST = 100_000
"""Characters that the text of a law may have; only long lists come near."""


def parse_law(text: str, key: str, folder: Path | None = None) -> Law | None:
    """The law that a string is, or None when the string is not one call of a law's name and nothing else.

    Parameters
    ----------
    text : str
        As ``uniform(0.8, 1.2)``; arguments are expressions of numbers, pi and e.
    key : str
        Dotted path of the entry, named by errors.
    folder : Path, optional
        Where the files of `sampled` are looked for; the working directory when left out.

    Raises
    ------
    InputError
        The string is a law with arguments that cannot be used.
    """
    opening = re.match(r"\s*([A-Za-z_]\w*)\s*\(", text)
    if opening is None or opening[1] not in LAWS:
        return None
    law = LAWS[opening[1]]
    text = " ".join(text.split()) if law is not Sampled else text.strip()
    if len(text) > LONGEST:
        raise InputError(
            key,
            f"a law of {len(text)} characters",
            f"at most {LONGEST} are read; put the values in a file: {Sampled.signature()}",
        )
    try:
        tree = read_tree(text, key)
    except InputError as error:
        raise InputError(key, error.found, f"write {law.signature()}") from None
    if not (isinstance(tree, ast.Call) and isinstance(tree.func, ast.Name)):
        return None
    try:
        return _law_of(law, tree, text, key, folder)
    except InputError as error:
        if error.key:
            raise
        raise InputError(key, error.found, error.needed, nearest=error.nearest) from None


def _law_of(law: type[Law], call: ast.Call, text: str, key: str, folder: Path | None) -> Law:
    if call.keywords or any(isinstance(argument, ast.Starred) for argument in call.args):
        raise InputError(
            key, f"a named argument in {shown(text)}", f"give the arguments in their order: {law.signature()}"
        )
    if len(call.args) != len(law.arguments):
        raise InputError(
            key, f"{len(call.args)} given to {law.name} in {shown(text)}", f"write {law.signature()}"
        )
    if law is Sampled:
        path, column = (_word(argument, text, key) for argument in call.args)
        values = read_column((folder or Path()) / path, column, path)
        return Sampled(path, column, values)
    if law is Discrete:
        values, weights = (_numbers(argument, text, key) for argument in call.args)
        return Discrete(values, weights)
    return law(*(_number(argument, law, text, key) for argument in call.args))


def _number(argument: ast.expr, law: type[Law], text: str, key: str) -> float:
    if isinstance(argument, ast.List | ast.Tuple):
        raise InputError(
            key, f"a list in {shown(text)}", f"lists stand only in discrete; write {law.signature()}"
        )
    if isinstance(argument, ast.Constant) and isinstance(argument.value, str):
        raise InputError(
            key, f"a quoted word in {shown(text)}", f"words stand only in sampled; write {law.signature()}"
        )
    return constant(ast.get_source_segment(text, argument) or "", key)


def _numbers(argument: ast.expr, text: str, key: str) -> tuple[float, ...]:
    if not isinstance(argument, ast.List):
        needed = f"write {Discrete.signature()}, as discrete([1, 2], [0.3, 0.7])"
        raise InputError(key, f"{shown(text)} without its lists", needed)
    # Cutting the source of every entry out of a long list is slow: plain literals are taken as they are.
    return tuple(
        float(entry.value)
        if isinstance(entry, ast.Constant) and type(entry.value) is float
        else _number(entry, Discrete, text, key)
        for entry in argument.elts
    )


def _word(argument: ast.expr, text: str, key: str) -> str:
    if isinstance(argument, ast.Constant) and isinstance(argument.value, str) and argument.value:
        return argument.value
    raise InputError(
        key,
        f"{shown(text)} without its quoted words",
        'write sampled("file.csv", "column"), within single quotation marks in the study file',
    )
