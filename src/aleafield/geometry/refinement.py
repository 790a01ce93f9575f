"""How a number of points grows and shrinks from one level to the next."""

from __future__ import annotations

from dataclasses import dataclass

from aleafield.errors import InputError


@dataclass(frozen=True)
class Refinement:
    """Counts of points when every gap between them is halved or doubled.

    Points that hold both ends of an interval go from n to 2n - 1 and back to (n + 1)/2, which needs an odd n;
    all others (inside an interval, or on a ring) go from n to 2n and back to n // 2, which needs an even n
    where the coarser gaps must be unions of finer ones.  The ratio of two levels is therefore not always 2,
    and orders are observed with the true one.

    Parameters
    ----------
    both_ends : bool
        Whether both ends of an interval are counted.
    smallest : int
        The smallest count that makes sense on any level.
    key : str
        The entry of the study file that gives the count; named in notes and errors.
    unions : bool
        Whether every gap of the coarser level must be a union of gaps: always so where both ends are counted.
    """

    both_ends: bool
    smallest: int
    key: str
    unions: bool = False

    @property
    def minimum(self) -> int:
        """The smallest count that has a coarser level."""
        return 2 * self.smallest - 1 if self.both_ends else 2 * self.smallest

    def refined(self, n: int) -> int:
        """The count with every gap halved."""
        return 2 * n - 1 if self.both_ends else 2 * n

    def admissible(self, n: int) -> tuple[int, str | None]:
        """The count to use where n was asked for, and a note where it is not n.

        Raises
        ------
        InputError
            Where n has no coarser level, which every observed order needs.
        """
        if n < self.minimum:
            needed = f"at least {self.minimum} is needed, so that a coarser level exists"
            raise InputError(self.key, f"{n}", needed)
        if self.both_ends and n % 2 == 0:
            return n + 1, f"{self.key} = {n} is even; a coarser level needs an odd number, {n + 1} is used"
        if self.unions and not self.both_ends and n % 2 == 1:
            return n + 1, f"{self.key} = {n} is odd; a coarser level needs an even number, {n + 1} is used"
        return n, None

    def coarsened(self, n: int) -> tuple[int, str | None]:
        """The count with every gap doubled, and a note where n stands for n + 1.

        Raises
        ------
        InputError
            Where n has no coarser level.
        """
        used, note = self.admissible(n)
        return ((used + 1) // 2 if self.both_ends else used // 2), note

    def check(self, n: int) -> None:
        """Raise InputError where n is too small for any level."""
        if n < self.smallest:
            raise InputError(self.key, f"{n}", f"at least {self.smallest} is needed")
