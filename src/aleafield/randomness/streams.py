"""Counter-based streams: every random number is a function of a seed, a purpose and where it stands.

Philox (Salmon, Moraes, Dror and Shaw 2011, "Parallel random numbers: as easy as 1, 2, 3"; from memory) turns
a key and a counter into numbers. The key is a hash of seed, purpose and numbers, so that streams of
different purposes have nothing in common and no stream depends on which others were used before it. Where very
many short streams are wanted, one for each noise path and stretch of time, they are places of one counter.
"""

from __future__ import annotations

import hashlib
from operator import index
from typing import SupportsIndex

import numpy as np
from numpy.typing import NDArray

from aleafield.arrays import FloatArray


def bit_generator(seed: SupportsIndex, purpose: str, *numbers: SupportsIndex) -> np.random.Philox:
    """The Philox counter of a seed, a purpose and the numbers that tell its streams apart, at position 0."""
    return np.random.Philox(
        np.random.SeedSequence(int.from_bytes(_digest(seed, purpose, *numbers), "little"))
    )


def generator(seed: SupportsIndex, purpose: str, *numbers: SupportsIndex) -> np.random.Generator:
    """A fresh generator of the stream of a seed, a purpose and numbers.

    >>> a, b = (generator(1, "example", 7).random() for _ in range(2))
    >>> a == b
    True
    """
    return np.random.Generator(bit_generator(seed, purpose, *numbers))


def key(seed: SupportsIndex, purpose: str) -> NDArray[np.uint64]:
    """The two words of the Philox key of a seed and a purpose."""
    return np.frombuffer(_digest(seed, purpose), dtype="<u8").astype(np.uint64)


class Places:
    """One Philox counter as very many streams, each at the place that four numbers name.

    Of the four words of the counter the first is the position within a stream; the others are (lane and block),
    repeat and sample. Going to a place costs about a microsecond, a hundredth of a fresh generator.

    Parameters
    ----------
    seed : int
    purpose : str

    Attributes
    ----------
    bits : numpy.random.Philox
    generator : numpy.random.Generator
        Both draw from the place that was named last.

    Examples
    --------
    >>> places = Places(1, "example")
    >>> places.go(0, 3, repeat=0, sample=7)
    >>> once = places.generator.standard_normal(2)
    >>> places.go(0, 3, repeat=0, sample=7)
    >>> bool((places.generator.standard_normal(2) == once).all())
    True
    """

    def __init__(self, seed: SupportsIndex, purpose: str) -> None:
        self.bits = np.random.Philox(key=key(seed, purpose))
        self.generator = np.random.Generator(self.bits)
        self._state = self.bits.state
        self._counter = self._state["state"]["counter"]

    def go(self, lane: int, block: int, repeat: int, sample: int) -> None:
        """Draw from here on at the start of a stream.

        Parameters
        ----------
        lane : 0 to 2^16 - 1; streams of one block that differ in kind
        block : 0 to 2^48 - 1
        repeat, sample : 0 to 2^64 - 1
        """
        self._counter[1] = lane << 48 | block
        self._counter[2] = repeat
        self._counter[3] = sample
        self.bits.state = self._state


def uniforms(raw: NDArray[np.uint64]) -> FloatArray:
    """Uniform numbers from words: the middle of one of 2^52 cells, so that 0 and 1 never occur."""
    return np.asarray(((raw >> np.uint64(12)).astype(np.float64) + 0.5) * 2.0**-52)


def _digest(seed: SupportsIndex, purpose: str, *numbers: SupportsIndex) -> bytes:
    """16 bytes that depend on everything named."""
    name = "\x1f".join([str(index(seed)), purpose, *(str(index(number)) for number in numbers)])
    return hashlib.blake2b(name.encode(), digest_size=16).digest()
