"""[noise]: strength and covariance of the noise in the tissue."""

from __future__ import annotations

from aleafield.errors import InputError
from aleafield.field.noise import (
    Correlation,
    CosineCorrelation,
    ExponentialCorrelation,
    GaussianCorrelation,
    LengthCorrelation,
    Noise,
    WhiteCorrelation,
)
from aleafield.field.rates import LinearRate, Rate
from aleafield.geometry import Domain
from aleafield.quantities import Quantity
from aleafield.study.reading.numbers import Numbers
from aleafield.study.reading.table import Table

_WITH_LENGTH: dict[str, type[LengthCorrelation]] = {
    form.name: form for form in (GaussianCorrelation, ExponentialCorrelation)
}
CORRELATIONS = (*_WITH_LENGTH, CosineCorrelation.name, WhiteCorrelation.name)
_GIVE_LENGTH = "give correlation = 'gaussian' or 'exponential' with a correlation_length"


def read_noise(table: Table, numbers: Numbers, domain: Domain, rate: Rate) -> Noise:
    """The noise; strength and correlation have no default.

    Raises
    ------
    InputError
        For an unknown correlation, entries that it does not read, a cosine correlation on an interval, and white
        noise under a rate that is not linear.
    """
    needed = "one of " + ", ".join(repr(name) for name in CORRELATIONS) + " is needed"
    table.value("correlation", needed=needed)
    name = table.choice("correlation", CORRELATIONS)
    correlation = _correlation(name, table, numbers)
    correlation.refuse_domain(domain)
    if correlation.roughness == "white" and not isinstance(rate, LinearRate):
        raise InputError(
            table.key("correlation"),
            "'white' under a rate that is not linear",
            "with noise that is white in space f(u) has no limit as the mesh is refined: "
            f"{_GIVE_LENGTH}, or take the linear rate",
        )
    return Noise(numbers.take(table, "strength", needed=_STRENGTH), correlation)


_STRENGTH = "the strength of the noise, activity times the root of a time, is needed: zero or positive"


def _correlation(name: str, table: Table, numbers: Numbers) -> Correlation:
    if name == WhiteCorrelation.name:
        if "correlation_length" in table:
            raise InputError(
                table.key("correlation_length"),
                "nothing reads it: white noise has no correlation length",
                "take it out, or write correlation = 'gaussian' or 'exponential'",
            )
        table.only(("strength", "correlation"), "white noise")
        return WhiteCorrelation()
    owner = f"noise with a correlation of the form {name}"
    if name == CosineCorrelation.name:
        table.only(("strength", "correlation", "coefficients"), owner)
        entries = table.entries(
            "coefficients", "a list of numbers [c_0, c_1, ..], zero or positive, is needed"
        )
        key = table.key("coefficients")
        return CosineCorrelation(tuple(numbers.read(c, f"{key}.{i}") for i, c in enumerate(entries)))
    table.only(("strength", "correlation", "correlation_length"), owner)
    needed = "the correlation length, a positive number in units of length, is needed"
    return _WITH_LENGTH[name](numbers.take(table, "correlation_length", needed=needed))


def refuse_pointwise(noise: Noise | None, quantities: tuple[Quantity, ...]) -> None:
    """Refuse quantities that do not exist for the field of white noise.

    Raises
    ------
    InputError
        Naming the first one.
    """
    if noise is None or noise.correlation.roughness != "white":
        return
    for quantity in quantities:
        if not quantity.defined_for_white_noise:
            raise InputError(
                quantity.key("measure"),
                f"{quantity.measure} under noise that is white in space",
                "such noise gives a field that is not a function, and its variance at a point grows like 1 / h: "
                "ask for a mean, an integral, a spectral power or a formula linear in u with in_space 'mean' or "
                f"'integral', or {_GIVE_LENGTH}",
            )
