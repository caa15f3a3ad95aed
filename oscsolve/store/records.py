"""Checksummed records in a file that only grows: what survives a killed writer.

A record is a mark of eight bytes, the length of its content, a checksum of the content and one of
the length, and the content: a JSON text behind its own length, and the bytes of arrays that the
text names. A reader trusts a record only if both checksums hold. A record that was cut short is the
last one; damage elsewhere is stepped over by looking for the next mark.
"""

from __future__ import annotations

import json
import struct
import zlib
from collections.abc import Iterator, Mapping
from typing import Any, BinaryIO

import numpy as np

MARK = b"\x8cosGRID\n"
_HEAD = struct.Struct("<8sQII")
_TEXT_LENGTH = struct.Struct("<I")
#: Bytes looked through at a time for the next mark.
_STRIDE = 1 << 20


def pack_record(entry: Mapping[str, Any], arrays: Mapping[str, np.ndarray]) -> bytes:
    """One record, ready to be appended.

    Parameters
    ----------
    entry : plain values, as JSON holds them; the key ``arrays`` is added
    arrays : name to array of numbers or of texts of fixed length
    """
    listed = [[name, array.dtype.str, list(array.shape)] for name, array in arrays.items()]
    # NumPy's numbers are no numbers to json.
    text = json.dumps({**entry, "arrays": listed}, default=float).encode()
    content = b"".join(
        [_TEXT_LENGTH.pack(len(text)), text, *(array.tobytes() for array in arrays.values())]
    )
    length = struct.pack("<Q", len(content))
    head = _HEAD.pack(MARK, len(content), zlib.crc32(content), zlib.crc32(length))
    return head + content


def unpack_record(content: bytes) -> tuple[dict[str, Any], dict[str, np.ndarray]]:
    """The entry and the arrays of a record whose checksums hold."""
    (length,) = _TEXT_LENGTH.unpack_from(content)
    begin = _TEXT_LENGTH.size + length
    entry = json.loads(content[_TEXT_LENGTH.size : begin])
    arrays = {}
    for name, dtype, shape in entry.pop("arrays"):
        count = int(np.prod(shape, dtype=np.int64))
        array = np.frombuffer(content, np.dtype(dtype), count, begin)
        arrays[name] = array.reshape(shape)
        begin += array.nbytes
    return entry, arrays


def read_content(stream: BinaryIO, offset: int) -> bytes | None:
    """The content of the record at `offset`, or None where no whole and sound record stands."""
    stream.seek(offset)
    head = stream.read(_HEAD.size)
    if len(head) < _HEAD.size:
        return None
    mark, length, checksum, length_checksum = _HEAD.unpack(head)
    if mark != MARK or zlib.crc32(struct.pack("<Q", length)) != length_checksum:
        return None
    content = stream.read(length)
    if len(content) < length or zlib.crc32(content) != checksum:
        return None
    return content


def scan(stream: BinaryIO) -> Iterator[tuple[int, int, bytes]]:
    """Sound records of a file in order: where each begins and ends, and its content."""
    offset: int | None = 0
    while offset is not None:
        content = read_content(stream, offset)
        if content is None:
            offset = _next_mark(stream, offset + 1)
            continue
        end = offset + _HEAD.size + len(content)
        yield offset, end, content
        offset = end


def _next_mark(stream: BinaryIO, offset: int) -> int | None:
    """Where the next mark stands at or behind `offset`, or None."""
    while True:
        stream.seek(offset)
        piece = stream.read(_STRIDE)
        at = piece.find(MARK)
        if at >= 0:
            return offset + at
        if len(piece) < _STRIDE:
            return None
        # A mark may lie across the border of two pieces.
        offset += len(piece) - len(MARK) + 1
