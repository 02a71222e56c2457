"""The compression of VBA sources, [MS-OVBA] 2.4.1."""

import struct

__all__ = ["compress", "decompress"]

CHUNK = 4096  # bytes of plain text in a chunk
SIGNATURE = 0x3000  # of a chunk's header
PACKED = 0x8000
MOST_CANDIDATES = 64  # places tried for a copy; more find little


def compress(data: bytes) -> bytes:
    """A compressed container."""
    chunks = [_chunk(data[i : i + CHUNK]) for i in range(0, len(data), CHUNK)]
    return b"\x01" + b"".join(chunks)


def decompress(container: bytes) -> bytes:
    """The text in a compressed container.

    Raises
    ------
    ValueError
        If it isn't one, or only a part of one.
    """
    if container[:1] != b"\x01":
        raise ValueError("no compressed container: it has to begin with 01")
    plain, at = bytearray(), 1
    while at < len(container):
        if at + 3 > len(container):
            raise ValueError(f"the chunk at {at} is cut off")
        (header,) = struct.unpack_from("<H", container, at)
        if header & 0x7000 != SIGNATURE:
            raise ValueError(f"no chunk at {at}")
        end = at + (header & 0x0FFF) + 3
        if end > len(container):
            raise ValueError(f"the chunk at {at} is cut off")
        body = container[at + 2 : end]
        plain += _plain(body) if header & PACKED else body
        at = end
    return bytes(plain)


def _offset_bits(position: int) -> int:
    """Bits that a copy token at this position of its chunk has for the offset."""
    return max((position - 1).bit_length(), 4) if position else 4


def _chunk(plain: bytes) -> bytes:
    packed = _packed(plain)
    if len(packed) < CHUNK:
        return struct.pack("<H", PACKED | SIGNATURE | (len(packed) - 1)) + packed
    # Not worth it: as it is, filled up to a whole chunk as the format asks; only a text could be shortened so.
    if len(plain) < CHUNK:
        raise ValueError("the last part can't be stored: it does not get shorter")
    return struct.pack("<H", SIGNATURE | (CHUNK - 1)) + plain


def _packed(plain: bytes) -> bytes:
    out, at = bytearray(), 0
    seen: dict[bytes, list[int]] = {}
    while at < len(plain):
        flags, tokens = 0, bytearray()
        for bit in range(8):
            if at >= len(plain):
                break
            length, offset = _longest_copy(plain, at, seen)
            if length:
                bits = _offset_bits(at)
                tokens += struct.pack("<H", ((offset - 1) << (16 - bits)) | (length - 3))
                flags |= 1 << bit
            else:
                tokens.append(plain[at])
            for k in range(at, at + (length or 1)):
                seen.setdefault(plain[k : k + 3], []).append(k)
            at += length or 1
        out.append(flags)
        out += tokens
    return bytes(out)


def _longest_copy(plain: bytes, at: int, seen: dict[bytes, list[int]]) -> tuple[int, int]:
    """Length and offset of the longest earlier text that goes on like this; 0, 0 if none is 3 long."""
    most = min((0xFFFF >> _offset_bits(at)) + 3, len(plain) - at)
    best, offset = 0, 0
    if most < 3:
        return 0, 0
    for start in reversed(seen.get(plain[at : at + 3], [])[-MOST_CANDIDATES:]):
        length = 3
        while length < most and plain[start + length] == plain[at + length]:
            length += 1
        if length > best:
            best, offset = length, at - start
    return best, offset


def _plain(body: bytes) -> bytes:
    out, at = bytearray(), 0
    while at < len(body):
        flags, at = body[at], at + 1
        for bit in range(8):
            if at >= len(body):
                break
            if flags >> bit & 1:
                token = int.from_bytes(body[at : at + 2], "little")
                bits = _offset_bits(len(out))
                start = len(out) - (token >> (16 - bits)) - 1
                if start < 0 or at + 2 > len(body):
                    raise ValueError("a copy of what is not there")
                for k in range((token & (0xFFFF >> bits)) + 3):
                    out.append(out[start + k])
                at += 2
            else:
                out.append(body[at])
                at += 1
    return bytes(out)
