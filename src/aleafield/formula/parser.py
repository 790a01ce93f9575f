"""From the text of a formula to a checked program for a stack of arrays.

The text is parsed to Python's syntax tree, which is only read, never compiled. Every node is compared with
the allow-list; whatever is not on it is an error that says what to write instead. What remains becomes a flat
program in postfix order, so that evaluation needs no recursion.
"""

from __future__ import annotations

import ast
import keyword
import math
import re
import warnings
from collections.abc import Iterator
from typing import Any, NamedTuple

import numpy as np

from aleafield.errors import InputError
from aleafield.formula.language import (
    BINARY,
    COMPARISON,
    CONSTANT_TABLE,
    FOREIGN_CHARACTERS,
    FUNCTION_TABLE,
    FUNCTIONS,
    LAW_NAMES,
    OTHER_WORDS,
    SUMMARY,
    Operation,
    nearest_name,
)

LONGEST = 2000
"""Characters a formula may have."""
MOST_NODES = 300
"""Nodes its syntax tree may have (numbers, names, operations)."""
DEEPEST = 40
"""Levels of nesting; a sum or product of many terms counts as one level."""


class Push(NamedTuple):
    """Put a number on the stack."""

    value: np.float64


class Read(NamedTuple):
    """Put the value of a name on the stack; `limit` marks a bare t that is compared."""

    name: str
    limit: bool


class Apply(NamedTuple):
    """Replace the last `arity` values on the stack by one."""

    operation: Operation
    arity: int


Program = tuple[Push | Read | Apply, ...]


class Chain:
    """The operation of a comparison, chained or not: 1.0 where every link holds and 0.0 elsewhere."""

    def __init__(self, links: tuple[Operation, ...]) -> None:
        self.links = links

    def __call__(self, *operands: Any) -> Any:
        holds = self.links[0](operands[0], operands[1])
        for link, left, right in zip(self.links[1:], operands[1:], operands[2:], strict=False):
            holds = np.logical_and(holds, link(left, right))
        return np.multiply(holds, 1.0)


def shown(text: str, longest: int = 60) -> str:
    """The text as a message quotes it: printable, and cut where it is long."""
    printable = "".join(c if c.isprintable() else "?" for c in text)
    return repr(printable if len(printable) <= longest else printable[: longest - 3] + "...")


def parse(text: str, key: str) -> tuple[ast.expr, Program]:
    """The checked syntax tree of a formula and its program.

    Raises
    ------
    InputError
        Names the key, what the formula holds, and what to write instead.
    """
    _check_characters(text, key)
    tree = read_tree(text, key)
    for number, _ in enumerate(_operations(tree), start=1):
        if number > MOST_NODES:
            raise InputError(
                key,
                f"a formula of more than {MOST_NODES} numbers, names and operations",
                "name parts of it as keys of their own",
            )
    return tree, tuple(_Compiler(text, key).program_of(tree))


def read_tree(text: str, key: str) -> ast.expr:
    """Python's syntax tree of one expression, unchecked; anything the parser raises is an InputError."""
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            return ast.parse(text, mode="eval").body
    except SyntaxError as error:
        raise InputError(key, f"{shown(text)} cannot be read", _way_out(text, error)) from None
    except (RecursionError, MemoryError, ValueError, OverflowError):
        raise InputError(
            key, f"{shown(text)} is nested too deeply", f"use at most {DEEPEST} levels of nesting"
        ) from None


def _operations(tree: ast.expr) -> Iterator[ast.AST]:
    contexts = (ast.expr_context, ast.operator, ast.unaryop, ast.cmpop, ast.boolop)
    return (node for node in ast.walk(tree) if not isinstance(node, contexts))


def _check_characters(text: str, key: str) -> None:
    if not text.strip():
        raise InputError(key, "an empty formula", "write 0 for nothing")
    if len(text) > LONGEST:
        raise InputError(
            key,
            f"a formula of {len(text)} characters",
            f"at most {LONGEST} are read; name parts of it as keys of their own",
        )
    for character in text:
        if character in FOREIGN_CHARACTERS:
            raise InputError(key, f"{character!r} in {shown(text)}", f"write {FOREIGN_CHARACTERS[character]}")
        if character == "#":
            raise InputError(
                key, f"a comment in {shown(text)}", "put # and what follows it outside the quotation marks"
            )
        if not (character.isascii() and character.isprintable()):
            raise InputError(
                key,
                f"the character {character!a} in {shown(text)}",
                "names are of the letters a to z and A to Z, digits and _",
            )


def _way_out(text: str, error: SyntaxError) -> str:
    if "parentheses" in str(error.msg) and "nested" in str(error.msg):
        return f"use at most {DEEPEST} levels of nesting"
    if text.count("(") != text.count(")"):
        return f"there are {text.count('(')} opening and {text.count(')')} closing parentheses"
    if re.search(r"&&|\|\||!(?!=)", text):
        return "write a * b for 'and', maximum(a, b) for 'or', 1 - a for 'not'"
    if re.search(r"(?<![=<>!])=(?!=)", text):
        return "a formula assigns nothing; write == to compare"
    for word in re.findall(r"[A-Za-z_]\w*", text):
        if keyword.iskeyword(word):
            return (
                f"{word!r} is no name in a formula; rename it, and write where(condition, a, b) for a choice"
            )
    if re.search(r"\d\s*[A-Za-z_(]|\)\s*[\w(]|\w\s+\w", text):
        return "write * for every product, as in 2*x, and a comma between arguments"
    return SUMMARY


class _Compiler:
    """Checks a syntax tree node by node and writes its program."""

    def __init__(self, text: str, key: str) -> None:
        self.text = text
        self.key = key
        self.program: list[Push | Read | Apply] = []

    def program_of(self, tree: ast.expr) -> list[Push | Read | Apply]:
        self._write(tree, 1)
        return self.program

    def _fault(self, found: str, needed: str, nearest: str | None = None) -> InputError:
        return InputError(self.key, f"{found} in {shown(self.text)}", needed, nearest=nearest)

    def _source(self, node: ast.AST) -> str:
        source = ast.get_source_segment(self.text, node) or ""
        return source if len(source) <= 40 else source[:37] + "..."

    def _write(self, node: ast.expr, depth: int) -> None:
        if depth > DEEPEST:
            raise self._fault(
                f"more than {DEEPEST} levels of nesting", "name parts of the formula as keys of their own"
            )
        if isinstance(node, ast.Constant):
            self.program.append(Push(self._number(node)))
        elif isinstance(node, ast.Name):
            self._write_name(node)
        elif isinstance(node, ast.BinOp):
            self._write_chain(node, depth)
        elif isinstance(node, ast.UnaryOp):
            self._write_sign(node, depth)
        elif isinstance(node, ast.Compare):
            self._write_comparison(node, depth)
        elif isinstance(node, ast.Call):
            self._write_call(node, depth)
        else:
            raise self._refused(node)

    def _number(self, node: ast.Constant) -> np.float64:
        value = node.value
        if isinstance(value, bool):
            raise self._fault(f"{value}", f"write {int(value)}")
        if isinstance(value, str | bytes):
            raise self._fault("a quoted word", "a formula holds no text; " + SUMMARY)
        if isinstance(value, complex):
            raise self._fault(f"the imaginary number {self._source(node)}", "numbers are real")
        if not isinstance(value, int | float):
            raise self._fault(f"{value!r}", SUMMARY)
        try:
            number = float(value)
        except OverflowError:
            number = math.inf
        if not math.isfinite(number):
            raise self._fault(f"the number {self._source(node)}", "numbers go up to about 1.8e308")
        return np.float64(number)

    def _write_name(self, node: ast.Name) -> None:
        if node.id in CONSTANT_TABLE:
            self.program.append(Push(np.float64(CONSTANT_TABLE[node.id])))
        elif node.id in FUNCTIONS:
            arguments = ", ".join("abc"[: FUNCTION_TABLE[node.id].arity])
            raise self._fault(f"the function {node.id} without arguments", f"write {node.id}({arguments})")
        else:
            self.program.append(Read(node.id, limit=False))

    def _write_chain(self, node: ast.BinOp, depth: int) -> None:
        links: list[tuple[Operation, ast.expr]] = []
        first: ast.expr = node
        while isinstance(first, ast.BinOp):
            operation = BINARY.get(type(first.op))
            if operation is None:
                raise self._refused(first)
            links.append((operation, first.right))
            first = first.left
        self._write(first, depth + 1)
        for operation, right in reversed(links):
            self._write(right, depth + 1)
            self.program.append(Apply(operation, 2))

    def _write_sign(self, node: ast.UnaryOp, depth: int) -> None:
        operand = self._source(node.operand)
        if isinstance(node.op, ast.Not):
            raise self._fault("'not'", f"write 1 - ({operand})")
        if isinstance(node.op, ast.Invert):
            raise self._fault("'~'", f"write 1 - ({operand})")
        self._write(node.operand, depth + 1)
        if isinstance(node.op, ast.USub):
            self.program.append(Apply(np.negative, 1))

    def _write_comparison(self, node: ast.Compare, depth: int) -> None:
        links = []
        for op in node.ops:
            if type(op) not in COMPARISON:
                word = {ast.In: "in", ast.NotIn: "not in", ast.Is: "is", ast.IsNot: "is not"}[type(op)]
                raise self._fault(f"{word!r}", "write == or != to compare two numbers")
            links.append(COMPARISON[type(op)])
        for operand in (node.left, *node.comparators):
            if isinstance(operand, ast.Name) and operand.id == "t":
                self.program.append(Read("t", limit=True))
            else:
                self._write(operand, depth + 1)
        self.program.append(Apply(Chain(tuple(links)), len(links) + 1))

    def _write_call(self, node: ast.Call, depth: int) -> None:
        if not isinstance(node.func, ast.Name):
            raise self._refused_call(node)
        name = node.func.id
        if name in LAW_NAMES:
            raise self._fault(
                f"the distribution {name}(...)",
                "a distribution stands alone: name it in [parameters] and use that name here",
            )
        if name not in FUNCTION_TABLE:
            if name in OTHER_WORDS:
                raise self._fault(f"the unknown function {name}", f"write {OTHER_WORDS[name]}")
            nearest = nearest_name(name, FUNCTIONS | LAW_NAMES)
            needed = "the functions are " + ", ".join(FUNCTION_TABLE) + f"; for a product write {name}*(...)"
            raise self._fault(f"the unknown function {name}", needed, nearest)
        if node.keywords:
            raise self._fault(
                f"a keyword argument of {name}", "give the arguments in their order, without names"
            )
        function = FUNCTION_TABLE[name]
        if len(node.args) != function.arity:
            plural = "argument" if function.arity == 1 else "arguments"
            needed = f"{name} takes {function.arity} {plural}"
            if name in ("minimum", "maximum") and len(node.args) > 2:
                needed += f", so nest it: {name}(a, {name}(b, c))"
            raise self._fault(f"{len(node.args)} given to {name}", needed)
        for argument in node.args:
            self._write(argument, depth + 1)
        self.program.append(Apply(function.operation, function.arity))

    def _refused_call(self, node: ast.Call) -> InputError:
        called = node.func
        if isinstance(called, ast.Attribute) and called.attr in FUNCTIONS:
            return self._fault(f"the call of {self._source(called)}", f"write {called.attr}(...)")
        if isinstance(called, ast.Constant | ast.BinOp | ast.UnaryOp):
            return self._fault(
                f"the call of {self._source(called)}", "write * for a product, as in 2*(x + 1)"
            )
        if isinstance(called, ast.Call):
            return self._fault("a call of what a call returns", "write * for a product, as in sin(x)*(x + 1)")
        return self._refused(called)

    def _refused(self, node: ast.expr) -> InputError:
        """The error for a node that is not on the list, with what to write instead."""
        if isinstance(node, ast.IfExp):
            test, body, other = (self._source(part) for part in (node.test, node.body, node.orelse))
            return self._fault("'if ... else'", f"write where({test}, {body}, {other})")
        if isinstance(node, ast.BoolOp):
            first, second = (self._source(value) for value in node.values[:2])
            if isinstance(node.op, ast.And):
                return self._fault("'and'", f"write ({first}) * ({second})")
            return self._fault("'or'", f"write maximum({first}, {second})")
        if isinstance(node, ast.BinOp):
            return self._refused_operator(node)
        for kind, (found, needed) in _REFUSED.items():
            if isinstance(node, kind):
                return self._fault(found, needed)
        return self._fault(f"{type(node).__name__}", SUMMARY)

    def _refused_operator(self, node: ast.BinOp) -> InputError:
        left, right = self._source(node.left), self._source(node.right)
        sign, needed = {
            ast.BitXor: ("^", f"write ({left})**({right}) for a power"),
            ast.Mod: ("%", "there is no remainder; for a periodic function use sin or cos"),
            ast.FloorDiv: ("//", f"write ({left}) / ({right}); division gives real numbers"),
            ast.MatMult: ("@", f"write ({left}) * ({right})"),
            ast.BitAnd: ("&", f"write ({left}) * ({right}), with each comparison in parentheses"),
            ast.BitOr: ("|", f"write maximum({left}, {right})"),
            ast.LShift: ("<<", f"write ({left}) * 2**({right})"),
            ast.RShift: (">>", f"write ({left}) / 2**({right})"),
        }[type(node.op)]
        return self._fault(f"{sign!r}", needed)


_REFUSED: dict[type[ast.expr], tuple[str, str]] = {
    ast.Attribute: ("an attribute ('.' after a name)", "a formula has no attributes; " + SUMMARY),
    ast.Subscript: ("an index ('[' after a name)", "a formula has no indices; name each number by itself"),
    ast.Tuple: ("a comma outside a call", "write a decimal point in a number, as in 0.5"),
    ast.List: ("a list", "lists stand only in discrete([values], [weights]); " + SUMMARY),
    ast.Set: ("a brace", "write ( and ) for grouping"),
    ast.Dict: ("a brace", "write ( and ) for grouping"),
    ast.Lambda: (
        "'lambda'",
        "a formula defines no functions; rename a parameter of that name",
    ),
    ast.JoinedStr: ("a quoted word", "a formula holds no text; " + SUMMARY),
    ast.Starred: ("a star before an argument", "write every argument out"),
    ast.NamedExpr: ("':='", "give the part a key of its own beside the formula"),
    ast.ListComp: ("a loop", "a formula has no loops; " + SUMMARY),
    ast.SetComp: ("a loop", "a formula has no loops; " + SUMMARY),
    ast.DictComp: ("a loop", "a formula has no loops; " + SUMMARY),
    ast.GeneratorExp: ("a loop", "a formula has no loops; " + SUMMARY),
}
