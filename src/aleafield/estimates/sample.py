"""The values of one quantity on the samples of a run."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from aleafield.arrays import BoolArray, FloatArray
from aleafield.estimates.blocks import BlockArray, BlockMean, block_mean, plain_mean


@dataclass(frozen=True, eq=False)
class Sample:
    """Values of one quantity on S realizations, and which of them are independent of each other.

    Realizations come in *blocks*.  Within a block they may depend on each other, different blocks are
    independent, and every block is as long as every other (save for failed realizations):

    - plain Monte Carlo: each realization is a block of its own, `replicates` = 1 and `replicate` all 0;
    - quasi-Monte Carlo: a block is one scrambling, `replicates` = 16;
    - repeated noise paths under plain Monte Carlo: a block is a *cluster*, one parameter sample with all its
      repeats, `replicate` = its number, `replicates` = the number of parameter samples, `clustered` set;
    - repeated noise paths under quasi-Monte Carlo: a block is one scrambling with the repeats of its points.

    Unless the sample is plain all intervals rest on the spread between blocks.

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
    clustered : bool
        The blocks are parameter samples with repeated noise paths, drawn plainly.

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
    clustered: bool = False

    @staticmethod
    def of(
        values: FloatArray,
        *,
        margin: FloatArray | None = None,
        valid: BoolArray | None = None,
        replicate: BlockArray | None = None,
        replicates: int = 1,
        certain: bool = False,
        clustered: bool = False,
    ) -> Sample:
        """A sample whose occurrence follows from its margin (without one the quantity always occurs)."""
        values = np.asarray(values, dtype=np.float64)
        valid = np.ones(values.shape, dtype=np.bool_) if valid is None else np.asarray(valid, dtype=np.bool_)
        occurs = valid if margin is None else valid & (margin >= 0.0)
        label = np.int16 if replicates <= np.iinfo(np.int16).max else np.int32
        if replicate is None:
            replicate = np.zeros(values.shape, dtype=label)
        replicate = np.asarray(replicate, dtype=label)
        return Sample(values, occurs, valid, margin, replicate, replicates, certain, clustered)

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
        return self.replicates == 1 and not self.clustered

    @property
    def scrambled(self) -> bool:
        """Whether blocks are scramblings, within which points repel each other."""
        return self.replicates > 1 and not self.clustered

    @cached_property
    def independent(self) -> int:
        """How many of `given` count when a statistic asks for a least number: clusters count once."""
        return self.independent_in(self.given_block)

    def independent_in(self, block: BlockArray) -> int:
        """How many of the realizations in these blocks (k,) count: clusters once, others each."""
        return len(np.unique(block)) if self.clustered else len(block)

    def mean_over(self, values: FloatArray, block: BlockArray) -> BlockMean:
        """Mean of values (k,), k >= 1, of realizations in these blocks (k,), from independent values or blocks.

        They may be any of the realizations: blocks that hold none of them are no evidence and are left out.
        """
        return plain_mean(values) if self.plain else block_mean(values, block, self.replicates)
