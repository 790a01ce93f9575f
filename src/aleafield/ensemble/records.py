"""What a level evaluated on sample indices gives back."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np

from aleafield.arrays import BoolArray, FloatArray, IntArray

FINITE = 0
FIELD_NOT_FINITE = 1
QUANTITY_NOT_FINITE = 2
FAILURE_MEANINGS: Mapping[int, str] = {
    FINITE: "finite",
    FIELD_NOT_FINITE: "field_not_finite",
    QUANTITY_NOT_FINITE: "quantity_not_finite",
}
"""Codes of `Records.failed`: a sample has failed when a value is not finite, never because it is large."""


@dataclass
class Records:
    """Values of S realizations at one level.

    Attributes
    ----------
    realizations : int array (S,)
        Their indices: realization j is noise path j mod R of parameter sample j // R, with R paths a sample.
        Those of another family than the main sample count within it.
    inputs : mapping of path to float array (S,)
    values : mapping of quantity name to float array (S,)
        NaN where the quantity does not occur or the sample failed.
    margins : mapping of quantity name to float array (S,)
        For quantities that may not occur: a continuous quantity that is >= 0 exactly where it occurs.
    failed : int array (S,)
        Code of `FAILURE_MEANINGS`.
    failed_at : float array (S,)
        Model time at which a failed sample ceased to be finite; NaN otherwise.
    fields : float array (S, K, n) or None
        The field at the K requested times and the level's nodes in increasing x.
    histories : mapping of quantity name to float array (S, K)
        For noisy fields: quantities of one state, followed at the K requested times; NaN where one does not
        occur or the realization failed.
    """

    realizations: IntArray
    inputs: dict[str, FloatArray]
    values: dict[str, FloatArray]
    margins: dict[str, FloatArray] = field(default_factory=dict)
    failed: IntArray = field(default_factory=lambda: np.zeros(0, dtype=np.int64))
    failed_at: FloatArray = field(default_factory=lambda: np.zeros(0))
    fields: FloatArray | None = None
    histories: dict[str, FloatArray] = field(default_factory=dict)

    def __len__(self) -> int:
        return len(self.realizations)

    @property
    def valid(self) -> BoolArray:
        """Which realizations did not fail, shape (S,)."""
        return np.asarray(self.failed == FINITE)

    @staticmethod
    def joined(pieces: Sequence[Records]) -> Records:
        """The realizations of several records, one after the other."""

        def columns(name: str) -> dict[str, FloatArray]:
            found = [getattr(piece, name) for piece in pieces]
            return {key: np.concatenate([columns[key] for columns in found]) for key in found[0]}

        fields = [piece.fields for piece in pieces if piece.fields is not None]
        return Records(
            realizations=np.concatenate([piece.realizations for piece in pieces]),
            inputs=columns("inputs"),
            values=columns("values"),
            margins=columns("margins"),
            failed=np.concatenate([piece.failed for piece in pieces]),
            failed_at=np.concatenate([piece.failed_at for piece in pieces]),
            fields=np.concatenate(fields) if fields else None,
            histories=columns("histories"),
        )

    def first(self, count: int) -> Records:
        """The first `count` realizations: what remains of a padded batch."""
        return Records(
            realizations=self.realizations[:count],
            inputs={k: v[:count] for k, v in self.inputs.items()},
            values={k: v[:count] for k, v in self.values.items()},
            margins={k: v[:count] for k, v in self.margins.items()},
            failed=self.failed[:count],
            failed_at=self.failed_at[:count],
            fields=None if self.fields is None else self.fields[:count],
            histories={k: v[:count] for k, v in self.histories.items()},
        )
