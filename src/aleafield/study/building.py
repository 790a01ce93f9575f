"""A study from Python objects: written as the text of a study file, then read like one.

So there is one set of rules, one set of messages and one digest, and the folder of a run built in Python holds
a study file that the command line can run again.
"""

from __future__ import annotations

import dataclasses
import hashlib
import inspect
import json
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

from aleafield.errors import InputError
from aleafield.field.formula_term import FormulaTerm
from aleafield.field.kernels import CosineKernel, ExponentialKernel, FormulaKernel, GaussianKernel, Kernel
from aleafield.field.noise import Noise
from aleafield.field.rates import (
    FormulaRate,
    LinearRate,
    LogisticRate,
    NormalOgiveRate,
    RampRate,
    Rate,
    StepRate,
)
from aleafield.formula import Formula
from aleafield.geometry import Interval, Ring
from aleafield.quantities import At, FunctionQuantity, Over, Quantity
from aleafield.randomness.laws import Law
from aleafield.study.reading import read_text
from aleafield.study.study import SensitivityRequest, Study

Sensitivity = SensitivityRequest
"""What is wanted of the inputs, under the name that it has in Python."""
Number = float | int | str | Formula | Law
"""A number, an expression of parameters as a string, or a law."""

_KERNEL_FORMS: Mapping[type[Kernel], str] = {
    GaussianKernel: "gaussian",
    ExponentialKernel: "exponential",
    CosineKernel: "cosine",
    FormulaKernel: "formula",
}
_RATE_FORMS: Mapping[type[Rate], str] = {
    LogisticRate: "logistic",
    NormalOgiveRate: "normal-ogive",
    RampRate: "ramp",
    StepRate: "step",
    LinearRate: "linear",
    FormulaRate: "formula",
}


def term(text: str, **names: Number) -> FormulaTerm:
    """A formula with the names that stand beside it.

    >>> term("a * exp(-x**2)", a=0.8).formula.text
    'a * exp(-x**2)'
    """
    return FormulaTerm(Formula(text), {k: Formula(v) if isinstance(v, str) else v for k, v in names.items()})


def build_study(
    title: str,
    *,
    domain: Interval | Ring,
    kernel: Kernel | Mapping[str, Kernel],
    rate: Rate,
    time_constant: Number,
    duration: float,
    quantities: Sequence[Quantity],
    parameters: Mapping[str, Number] | None = None,
    drive: FormulaTerm | Number = 0.0,
    initial: FormulaTerm | Number = 0.0,
    noise: Noise | None = None,
    scheme: Mapping[str, Any] | None = None,
    sampling: Mapping[str, Any] | None = None,
    aim: Mapping[str, Any] | None = None,
    dependence: Mapping[str, Any] | None = None,
    sensitivity: SensitivityRequest | None = None,
    report: Mapping[str, Any] | None = None,
    keep: Mapping[str, Any] | None = None,
    units: Mapping[str, str] | None = None,
    about: str = "",
    seed: int = 1,
    folder: Path | str = ".",
) -> Study:
    """A study built from objects; the mappings take the keys of the study file's sections.

    Parameters
    ----------
    title, about : free text
    domain : Interval or Ring
    kernel : a kernel, or named parts that add up
    rate : firing rate
    time_constant, duration : units of time
    quantities : at least one; a `FunctionQuantity` may hold any Python function of the field
    parameters : named numbers that others use as strings
    drive, initial : a number, the text of a formula, or `term(text, name=value, ..)`
    noise : noise in the tissue, as `Noise(0.02, GaussianCorrelation(0.5))`
    scheme, sampling, aim, dependence, report, keep, units : as in the study file
    sensitivity : which inputs cause the spread, as `Sensitivity(["first", "total"])`
    seed : int
    folder : where relative paths of data files start

    Raises
    ------
    InputError
        For whatever a study file would be refused for.
    """
    lines = [f"title = {_quoted(title)}", f"seed = {seed}"]
    if about:
        lines.append(f"about = {_quoted(about)}")
    if units:
        lines.append(f"units = {_value(units)}")
    if parameters:
        lines += ["", "[parameters]", *_entries(parameters)]
    lines += ["", "[domain]", *_domain(domain)]
    if isinstance(kernel, Kernel):
        lines += ["", "[kernel]", *_kernel(kernel)]
    else:
        for name, part in kernel.items():
            lines += ["", f"[kernel.{_key(name)}]", *_kernel(part)]
    lines += ["", "[rate]", f'form = "{_form(rate, _RATE_FORMS)}"', *_numbers(rate)]
    lines += ["", "[drive]", *_term(drive), "", "[initial]", *_term(initial)]
    lines += ["", "[dynamics]", f"time_constant = {_value(time_constant)}", f"duration = {_value(duration)}"]
    if noise is not None:
        lines += ["", "[noise]", *_noise(noise)]
    sections = {
        "scheme": scheme,
        "sampling": sampling,
        "aim": aim,
        "dependence": dependence,
        "sensitivity": None if sensitivity is None else _asked(sensitivity),
        "report": report,
        "keep": keep,
    }
    written = [q for q in quantities if not isinstance(q, FunctionQuantity)]
    functions = [q for q in quantities if isinstance(q, FunctionQuantity)]
    for quantity in written:
        lines += ["", "[[quantity]]", *_quantity(quantity)]
    for name, entries in sections.items():
        if entries:
            lines += ["", f"[{name}]", *_entries(entries)]
    text = "\n".join(lines) + "\n"
    study = read_text(text, Path(folder) / "study.toml", extra_quantities=tuple(functions))
    if not functions:
        return study
    digest = hashlib.sha256(study.digest.encode())
    for quantity in functions:
        digest.update(_source_of(quantity))
    return dataclasses.replace(study, digest=digest.hexdigest())


def _asked(sensitivity: SensitivityRequest) -> dict[str, Any]:
    """The entries of [sensitivity]; what is not asked for is left out."""
    return {name: value for name, value in dataclasses.asdict(sensitivity).items() if value is not None}


def _source_of(quantity: FunctionQuantity) -> bytes:
    """What identifies a Python function in the digest: its source, or its code where no source is at hand."""
    try:
        return inspect.getsource(quantity.function).encode()
    except (OSError, TypeError):
        code = getattr(quantity.function, "__code__", None)
        return repr(quantity.function).encode() if code is None else code.co_code


def _quoted(text: str) -> str:
    return json.dumps(text, ensure_ascii=False).replace("\x7f", "\\u007f")


def _key(name: str) -> str:
    return name if name.replace("_", "").replace("-", "").isalnum() and name.isascii() else _quoted(name)


def _value(value: Any) -> str:
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, str):
        return _quoted(value)
    if isinstance(value, Formula | Law):
        return _quoted(value.text)
    if isinstance(value, Mapping):
        return "{ " + ", ".join(f"{_key(k)} = {_value(v)}" for k, v in value.items()) + " }"
    if isinstance(value, Sequence):
        return "[" + ", ".join(_value(v) for v in value) + "]"
    if isinstance(value, int):
        return str(value)
    return repr(float(value))


def _entries(entries: Mapping[str, Any]) -> list[str]:
    return [f"{_key(name)} = {_value(value)}" for name, value in entries.items()]


def _numbers(item: Any) -> list[str]:
    """The numbers of a kernel or a rate, or the formula and the names beside it."""
    if isinstance(item, FormulaKernel | FormulaRate):
        return _term(item.term)
    return [f"{f.name} = {_value(getattr(item, f.name))}" for f in dataclasses.fields(item)]


def _term(term: FormulaTerm | Number) -> list[str]:
    if isinstance(term, Law):
        raise InputError(
            "drive", f"{term.text} given", "a law needs a name beside a formula: term('a', a=law)"
        )
    if not isinstance(term, FormulaTerm):
        text = (
            term if isinstance(term, str) else term.text if isinstance(term, Formula) else repr(float(term))
        )
        return [f"formula = {_quoted(text)}"]
    return [f"formula = {_quoted(term.formula.text)}", *_entries(term.names)]


def _form(item: Any, forms: Mapping[Any, str]) -> str:
    return forms[type(item)]


def _kernel(kernel: Kernel) -> list[str]:
    return [f'form = "{_form(kernel, _KERNEL_FORMS)}"', *_numbers(kernel)]


def _noise(noise: Noise) -> list[str]:
    name = noise.correlation.name
    return [
        f"strength = {_value(noise.strength)}",
        f"correlation = {_quoted(name)}",
        *_numbers(noise.correlation),
    ]


def _domain(domain: Interval | Ring) -> list[str]:
    if isinstance(domain, Ring):
        return ['shape = "ring"', f"length = {_value(domain.length)}"]
    return ['shape = "interval"', f"from = {_value(domain.low)}", f"to = {_value(domain.high)}"]


def _quantity(quantity: Quantity) -> list[str]:
    lines = [f"name = {_quoted(quantity.name)}", f"measure = {_quoted(quantity.measure)}"]
    for spec in dataclasses.fields(quantity):  # type: ignore[arg-type]
        value = getattr(quantity, spec.name)
        if spec.name in ("name", "reference") or value is None:
            continue
        if isinstance(value, At):
            lines += [] if value.time is None else [f"time = {_value(value.time)}"]
        elif isinstance(value, Over):
            lines += [f"over = {_value([value.start, value.end])}", f"reduce = {_quoted(value.reduce)}"]
        elif isinstance(value, FormulaTerm):
            lines += _term(value)
        else:
            lines.append(f"{spec.name} = {_value(value)}")
    return lines
