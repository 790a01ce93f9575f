"""The hypotheses of the convergence theory, and whether a study fulfils them."""

from __future__ import annotations

from dataclasses import dataclass

from aleafield.field.equation import FieldEquation
from aleafield.field.kernels import FormulaKernel
from aleafield.field.rates import FormulaRate, LinearRate
from aleafield.forward.field_model import FieldModel
from aleafield.projection.smoothness import drive_is_smooth, initial_is_smooth, kernel_is_smooth, typical


@dataclass(frozen=True)
class Hypothesis:
    """One hypothesis of the convergence theory.

    Attributes
    ----------
    name : str
    holds : bool or None
        None where it cannot be told.
    reason : str
    """

    name: str
    holds: bool | None
    reason: str

    @property
    def verdict(self) -> str:
        """ "holds", "does not hold" or "not known"."""
        return "not known" if self.holds is None else "holds" if self.holds else "does not hold"


def hypotheses(equation: FieldEquation, model: FieldModel) -> list[Hypothesis]:
    """The hypotheses under which the theory gives an order, and whether they hold for an unbound equation."""
    rate, sample = equation.rate, typical(equation)
    unknown = isinstance(rate, FormulaRate)
    bounded = None if unknown else rate.bounded
    form = "a formula" if unknown else "the form"
    smooth_rate = rate.smoothness == "smooth"
    if unknown and smooth_rate:
        slope: tuple[bool | None, str] = (
            None,
            "smooth by its formula; whether its slope is bounded is not known",
        )
    elif smooth_rate:
        slope = (True, "f is smooth and its slope is bounded")
    elif rate.smoothness == "step":
        slope = (
            False,
            "f jumps at the threshold; the crossings are resolved, only observed orders are claimed",
        )
    else:
        slope = (False, "f has a kink or a jump")
    drive, initial = drive_is_smooth(sample), initial_is_smooth(sample)
    found = [
        Hypothesis(
            "bounded rate",
            bounded,
            f"{form} is bounded"
            if bounded
            else "a linear rate grows without bound"
            if isinstance(rate, LinearRate)
            else "whether the formula is bounded is not known; solutions may blow up",
        ),
        Hypothesis("differentiable rate with bounded derivative", *slope),
        _continuous_kernel(sample),
        Hypothesis(
            "smooth drive and initial state",
            drive and initial,
            "smooth in x"
            if drive and initial
            else f"the {'initial state' if drive else 'drive'} has a kink or a jump in x",
        ),
        Hypothesis(
            "switches of the drive on the schedule",
            not model.switching.uncertain,
            "at uncertain times, or at times that depend on x: order 1 in time"
            if model.switching.uncertain
            else f"at {', '.join(f'{t:g}' for t in model.switching.times)}"
            if model.switching.times
            else "the drive does not switch",
        ),
    ]
    if model.noise is not None:
        found.append(
            Hypothesis(
                "noise that is a function of x",
                not model.noise.white,
                "white in space: the field is no function, and only what is integrated over space has a limit"
                if model.noise.white
                else "its variance at a point is finite",
            )
        )
    return found


def _continuous_kernel(sample: FieldEquation) -> Hypothesis:
    name = "continuous kernel"
    if kernel_is_smooth(sample):
        return Hypothesis(name, True, "smooth everywhere, the diagonal included")
    if any(isinstance(part, FormulaKernel) for part in sample.kernel.parts.values()):
        return Hypothesis(name, None, "not smooth; whether it has kinks or jumps is not known")
    return Hypothesis(name, True, "with a kink on the diagonal, which spoils rules for smooth integrands")
