"""Counter-based streams: every random number is a function of a seed, a purpose and where it stands.

Philox (Salmon, Moraes, Dror and Shaw 2011, "Parallel random numbers: as easy as 1, 2, 3"; from memory) turns
a key and a counter into numbers. The key is a hash of seed, purpose and numbers, so that streams of
different purposes have nothing in common and no stream depends on which others were used before it.
"""

from __future__ import annotations

import hashlib
from operator import index
from typing import SupportsIndex

import numpy as np


def bit_generator(seed: SupportsIndex, purpose: str, *numbers: SupportsIndex) -> np.random.Philox:
    """The Philox counter of a seed, a purpose and the numbers that tell its streams apart, at position 0."""
    name = "\x1f".join([str(index(seed)), purpose, *(str(index(number)) for number in numbers)])
    digest = hashlib.blake2b(name.encode(), digest_size=16).digest()
    return np.random.Philox(np.random.SeedSequence(int.from_bytes(digest, "little")))


def generator(seed: SupportsIndex, purpose: str, *numbers: SupportsIndex) -> np.random.Generator:
    """A fresh generator of the stream of a seed, a purpose and numbers.

    >>> a, b = (generator(1, "example", 7).random() for _ in range(2))
    >>> a == b
    True
    """
    return np.random.Generator(bit_generator(seed, purpose, *numbers))
