"""The semi-discrete field u_n' = P_n N(u_n), noise included: everything a time stepper may know of it."""

from __future__ import annotations

import numpy as np

from aleafield.arrays import FloatArray
from aleafield.field.formula_term import FormulaTerm
from aleafield.field.parameter import Bound, per_sample
from aleafield.projection.forcing import Forcing
from aleafield.projection.integral import IntegralTerm
from aleafield.projection.restriction import Restriction
from aleafield.spaces import Space


class ProjectedTerm:
    """P_n of a function of x and t given by a formula.

    What does not depend on t is projected once; what does is kept for the last time asked for, since two
    stages of a step share one.

    Parameters
    ----------
    term : FormulaTerm
        Bound.
    points : float array (T,)
        The test points.
    restriction : Restriction
    """

    def __init__(self, term: FormulaTerm, points: FloatArray, restriction: Restriction) -> None:
        self._term, self._points, self._restriction = term, points, restriction
        self._steady = not term.depends_on("t")
        self._last: tuple[tuple[float, float | None], FloatArray] | None = None

    def at(self, t: float, inside: float | None = None) -> FloatArray:
        """Unknowns (1, n) where no number of the formula depends on the sample, else (S, n)."""
        key = (0.0, None) if self._steady else (t, inside)
        if self._last is None or self._last[0] != key:
            values = self._term.evaluate({"x": self._points, "t": t}, axes=1, inside=inside)
            shape = np.broadcast_shapes((1, 1), values.shape, self._points.shape)
            self._last = key, self._restriction.apply(np.array(np.broadcast_to(values, shape)))
        return self._last[1]


class SemiDiscreteField:
    """tau du = (-u + P_n [ integral of w f(u) + drive ]) dt + sigma P_n dW for a batch of samples.

    Parameters
    ----------
    space : Space
    integral : IntegralTerm
    drive, initial : ProjectedTerm
    time_constant : float or array (S,)
        tau in units of time.
    batch_size : int
        S.
    restarts : bool
        Whether the drive may change from step to step at times that no schedule holds, so that a derivative
        at the end of a step must not be taken for that at the start of the next.
    forcing : Forcing, optional
        The noise; None where there is none.
    """

    def __init__(
        self,
        space: Space,
        integral: IntegralTerm,
        drive: ProjectedTerm,
        initial: ProjectedTerm,
        time_constant: Bound,
        batch_size: int,
        restarts: bool,
        forcing: Forcing | None = None,
    ) -> None:
        self.space = space
        self.restarts = restarts
        self.forcing = forcing
        self._integral = integral
        self._drive = drive
        self._initial = initial
        self._speed = 1.0 / per_sample(time_constant, 1)
        self._batch_size = batch_size

    def initial(self) -> FloatArray:
        """Unknowns (S, n) of the projected initial state."""
        start = self._initial.at(0.0)
        return np.array(np.broadcast_to(start, (self._batch_size, self.space.n)))

    def rate_of_change(self, t: float, u: FloatArray, inside: float | None = None) -> FloatArray:
        """du/dt as a fresh array (S, n), units of activity per time.

        Parameters
        ----------
        t : float
        u : float array (S, n)
            Left as it is.  A row that is not finite gives such a row and disturbs no other.
        inside : float, optional
            A time inside the current step, by which switches of the drive are decided.
        """
        change = self._integral.of(u)
        change += self._drive.at(t, inside)
        change -= u
        change *= self._speed
        return change

    def noise(self, increments: FloatArray) -> FloatArray:
        """(sigma / tau) P_n dW, increments of the unknowns (S, n) from those of the modes (S, m)."""
        assert self.forcing is not None, "a field without noise"
        return self.forcing.apply(increments)
