"""Small pictures as PNG, written with zlib alone."""

from __future__ import annotations

import base64
import struct
import zlib

import numpy as np
from numpy.typing import NDArray

Bytes = NDArray[np.uint8]


def _block(kind: bytes, content: bytes) -> bytes:
    return struct.pack(">I", len(content)) + kind + content + struct.pack(">I", zlib.crc32(kind + content))


def png(indices: Bytes, colours: Bytes) -> bytes:
    """A picture whose pixels are indices into a table of colours (ISO/IEC 15948, colour type 3).

    Parameters
    ----------
    indices : uint8 array (height, width), first row at the top
    colours : uint8 array (at most 256, 3)
    """
    height, width = indices.shape
    rows = np.zeros((height, width + 1), dtype=np.uint8)  # each row begins with filter type 0
    rows[:, 1:] = indices
    return b"".join(
        (
            b"\x89PNG\r\n\x1a\n",
            _block(b"IHDR", struct.pack(">IIBBBBB", width, height, 8, 3, 0, 0, 0)),
            _block(b"PLTE", colours.tobytes()),
            _block(b"IDAT", zlib.compress(rows.tobytes(), 9)),
            _block(b"IEND", b""),
        )
    )


def data_address(picture: bytes) -> str:
    """The picture as an address that needs no file and no network."""
    return "data:image/png;base64," + base64.b64encode(picture).decode("ascii")
