"""A study's field and discretisation in words, for the methods paragraph of the report."""

from __future__ import annotations

import dataclasses
import re
from collections.abc import Mapping
from typing import Any

from aleafield.field.formula_term import FormulaTerm
from aleafield.field.kernels import FormulaKernel, Kernel
from aleafield.field.noise import Noise
from aleafield.field.rates import FormulaRate, Rate
from aleafield.formula import Formula
from aleafield.geometry import Domain
from aleafield.projection.pairing import Pairing, resolve
from aleafield.randomness.inputs import Dependence
from aleafield.randomness.laws import Law
from aleafield.report.data import ModelText
from aleafield.runs.plan_file import Plan
from aleafield.stepping.schedule import Schedule
from aleafield.study.study import Study
from aleafield.units import ACTIVITY, LENGTH, TIME, Dimension, Units


def model_text(study: Study, plan: Plan) -> ModelText:
    """The field of a study, and how a plan treats its integral and its steps.

    Laws and expressions of parameters stand as the study writes them.
    """
    equation, units = study.equation, study.units
    duration = equation.dynamics.duration
    steps = Schedule.through(plan.schedule_times, plan.time_step, duration).counts
    return ModelText(
        domain=_domain(equation.domain, units),
        kernel={name: _kernel(part, units) for name, part in equation.kernel.parts.items()},
        rate=_rate(equation.rate, units),
        drive=_term(equation.drive),
        initial=_term(equation.initial),
        time_constant=_number(equation.dynamics.time_constant, TIME, units),
        duration=_number(duration, TIME, units),
        integrals=_integrals(resolve(study.scheme, equation)),
        steps=sum(steps),
        noise=None if equation.noise is None else _noise(equation.noise, plan, equation.domain, units),
        bridged=()
        if equation.noise is None
        else tuple(quantity.name for quantity in study.quantities if quantity.bridged),
        dependence=_dependence(study.dependence),
    )


def _dependence(dependence: Dependence) -> str:
    """Correlations that join something, and whether rows of a file are drawn whole."""
    found = [f"rank correlation {rho:g} of {a} and {b}" for a, b, rho in dependence.rank_correlation if rho]
    if dependence.sampled_together:
        found.append("inputs from one file are drawn as whole rows of it")
    return "; ".join(found)


def _number(value: Any, dimension: Dimension, units: Units) -> str:
    """A number, a law or an expression, with its unit."""
    text = value.text if isinstance(value, Formula | Law) else f"{value:.10g}"
    unit = units.derived(dimension)
    return text if unit == "1" else f"{text} {unit}"


def _domain(domain: Domain, units: Units) -> str:
    if domain.periodic:
        return f"the ring of length {_number(domain.length, LENGTH, units)}"
    return f"the interval from {domain.low:.10g} to {_number(domain.high, LENGTH, units)}"


def _noise(noise: Noise, plan: Plan, domain: Domain, units: Units) -> str:
    """Correlation, numbers and modes of the noise."""
    assert plan.noise is not None
    numbers = [f"strength {_number(noise.strength, ACTIVITY, units)}", _numbers(noise.correlation, units)]
    form = f"{noise.correlation.name} ({', '.join(text for text in numbers if text)})"
    ring = "the ring" if domain.periodic else f"a ring of {_number(plan.noise.length, LENGTH, units)}"
    return f"{form}, {plan.noise.modes} modes of {ring}"


def _name(item: object, ending: str) -> str:
    """Name of a form from its class, as in "normal-ogive" from NormalOgiveRate."""
    words = re.findall("[A-Z][a-z]+", type(item).__name__.removesuffix(ending))
    return "-".join(words).lower()


def _numbers(item: object, units: Units) -> str:
    """The numbers of a kernel, a rate or a correlation by name, as in "strength 1.4 mV, width 1 mm"."""
    written = []
    for spec in dataclasses.fields(item):  # type: ignore[arg-type]
        value = getattr(item, spec.name)
        entries = value if isinstance(value, tuple) else (value,)
        texts = [_number(entry, spec.metadata["dimension"], units) for entry in entries]
        written.append(f"{spec.name.replace('_', ' ')} {', '.join(texts)}")
    return ", ".join(written)


def _kernel(kernel: Kernel, units: Units) -> str:
    if isinstance(kernel, FormulaKernel):
        return f"w(x, y) = {_term(kernel.term)}"
    return f"{_name(kernel, 'Kernel')} ({_numbers(kernel, units)})"


def _rate(rate: Rate, units: Units) -> str:
    if isinstance(rate, FormulaRate):
        return f"f(u) = {_term(rate.term)}"
    return f"{_name(rate, 'Rate')} ({_numbers(rate, units)})"


def _term(term: FormulaTerm) -> str:
    """A formula and the names beside it that it uses."""
    used = term.used()
    names: Mapping[str, Any] = {name: value for name, value in term.names.items() if name in used}
    if not names:
        return term.formula.text
    values = [
        f"{name} = {value.text if isinstance(value, Formula | Law) else f'{value:.10g}'}"
        for name, value in names.items()
    ]
    return f"{term.formula.text}, with {', '.join(values)}"


def _integrals(pairing: Pairing) -> str:
    """A clause that says how the integral over y was taken."""
    points = pairing.quadrature_points
    if pairing.kernel_use == "closed":
        return (
            f"threshold crossings were located between {points} points and the integrals taken in closed form"
        )
    if pairing.crossings:
        return f"integrals of the step rate resolved the threshold crossings between {points} points"
    if pairing.kernel_use == "exact symbol":
        return f"the kernel acted by its exact Fourier symbol on the firing rate at {points} points"
    if pairing.rule == "composite gauss":
        return f"integrals were taken by the two-point Gauss rule on every element between {points} nodes"
    return f"integrals were taken by the {pairing.rule} rule with {points} points"
