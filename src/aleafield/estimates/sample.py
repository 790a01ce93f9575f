"""The values of one quantity on the samples of a run."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from aleafield.arrays import BoolArray, FloatArray
from aleafield.estimates.blocks import BlockArray


@dataclass(frozen=True, eq=False)
class Sample:
    """Values of one quantity on S realizations, and which of them are independent of each other.

    Realizations come in *blocks*.  Within a block they may depend on each other, different blocks are
    independent, and every block is as long as every other (save for failed realizations):

    - plain Monte Carlo: each realization is a block of its own, `replicates` = 1 and `replicate` all 0;
    - quasi-Monte Carlo: a block is one scrambling, `replicates` = 16;
    - repeated noise paths: a block is one parameter sample with all its repeats, `replicate` = its number and
      `replicates` = the number of parameter samples (under quasi-Monte Carlo a scrambling holds the repeats
      of its points, and nothing changes).

    With `replicates` > 1 all intervals rest on the spread between blocks.

    Attributes
    ----------
    values : float array (S,)
        NaN where the quantity does not occur or the realization failed.
    occurs : bool array (S,)
        Whether the quantity occurs; False for failed realizations.
    valid : bool array (S,)
        Whether the realization did not fail.  Failed ones enter no statistic.
    margin : float array (S,) or None
        For a quantity that may not occur: a continuous quantity that is >= 0 exactly where it occurs.
    replicate : int array (S,)
        The block of each realization, 0 .. replicates - 1.
    replicates : int
        Number of blocks; 1 for plain Monte Carlo.
    certain : bool
        No input and no noise: one realization is the whole law, and there is no sampling error.

    Raises
    ------
    ValueError
        When shapes disagree, when `occurs` contradicts the margin, when a quantity without a margin does not
        always occur, or when a value that counts is not finite.
    """

    values: FloatArray
    occurs: BoolArray
    valid: BoolArray
    margin: FloatArray | None
    replicate: BlockArray
    replicates: int = 1
    certain: bool = False

    @staticmethod
    def of(
        values: FloatArray,
        *,
        margin: FloatArray | None = None,
        valid: BoolArray | None = None,
        replicate: BlockArray | None = None,
        replicates: int = 1,
        certain: bool = False,
    ) -> Sample:
        """A sample whose occurrence follows from its margin (without one the quantity always occurs)."""
        values = np.asarray(values, dtype=np.float64)
        valid = np.ones(values.shape, dtype=np.bool_) if valid is None else np.asarray(valid, dtype=np.bool_)
        occurs = valid if margin is None else valid & (margin >= 0.0)
        label = np.int16 if replicates <= np.iinfo(np.int16).max else np.int32
        if replicate is None:
            replicate = np.zeros(values.shape, dtype=label)
        replicate = np.asarray(replicate, dtype=label)
        return Sample(values, occurs, valid, margin, replicate, replicates, certain)

    def __post_init__(self) -> None:
        arrays = [self.occurs, self.valid, self.replicate] + ([] if self.margin is None else [self.margin])
        if any(array.shape != self.values.shape for array in arrays) or self.values.ndim != 1:
            raise ValueError("all arrays of a sample need the shape (S,)")
        expected = self.valid if self.margin is None else self.valid & (self.margin >= 0.0)
        if not np.array_equal(self.occurs, expected):
            raise ValueError("a quantity occurs where its margin is >= 0; without a margin it always occurs")
        if not (np.isfinite(self.values) | ~self.occurs).all():
            raise ValueError("a value that is not finite marks a failed realization; it must not be valid")

    @cached_property
    def given(self) -> FloatArray:
        """The values where the quantity occurs, shape (number of them,)."""
        return self.values if self.occurs.all() else self.values[self.occurs]

    @cached_property
    def given_block(self) -> BlockArray:
        """The blocks of `given`."""
        return self.replicate if self.occurs.all() else self.replicate[self.occurs]

    @cached_property
    def ordered(self) -> FloatArray:
        """`given`, increasing."""
        return np.sort(self.given)

    @cached_property
    def valid_margin(self) -> FloatArray:
        """The margins of the realizations that did not fail; needs a margin, shape (n_valid,)."""
        assert self.margin is not None
        return self.margin if self.valid.all() else self.margin[self.valid]

    @cached_property
    def n_valid(self) -> int:
        """Number of realizations that did not fail."""
        return int(self.valid.sum())

    @property
    def plain(self) -> bool:
        """Whether each realization is independent of all others."""
        return self.replicates == 1
