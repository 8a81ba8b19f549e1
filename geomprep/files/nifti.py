"""NIfTI-1 and NIfTI-2 in a single file, ``.nii`` and ``.nii.gz``.

Layout of the header: https://nifti.nimh.nih.gov/nifti-1 (from memory, held against VTK's reader in the tests).
"""

from __future__ import annotations

import math
import struct
import zlib

from geomprep.errors import FileError
from geomprep.files.shape_reading import ImageLayout

__all__ = ["layout"]

_BYTES = {2: 1, 4: 2, 8: 4, 16: 4, 64: 8, 256: 1, 512: 2, 768: 4, 1024: 8, 1280: 8}
"""Size of a value by the code of its type: whole numbers of 8 to 64 bits and two kinds of floats."""

_UNITS = {1: "m", 2: "mm", 3: "um"}
_PACKED = b"\x1f\x8b"
_CHUNK = 1 << 20
_SLACK = 1 << 20  # bytes that may follow the values


def layout(name: str, data: bytes) -> ImageLayout:
    """Return shape and unit of the image; raise FileError where the bytes do not hold its values."""
    packed = data[:2] == _PACKED
    head = _unpacked_head(name, data) if packed else data[:540]
    order, second = _kind(name, head)
    if second:
        dims, code = struct.unpack_from(f"{order}8q", head, 16), struct.unpack_from(f"{order}h", head, 12)[0]
        first, units = struct.unpack_from(f"{order}q", head, 168)[0], struct.unpack_from(f"{order}i", head, 500)[0]
        scale = struct.unpack_from(f"{order}2d", head, 176)
    else:
        dims, code = struct.unpack_from(f"{order}8h", head, 40), struct.unpack_from(f"{order}h", head, 70)[0]
        first, units = struct.unpack_from(f"{order}f", head, 108)[0], head[123]
        scale = struct.unpack_from(f"{order}2f", head, 112)
    shape = _shape(name, dims)
    if code not in _BYTES:
        raise FileError(name, f"values are of NIfTI type {code}; a mask needs one whole number per voxel")
    if not all(map(math.isfinite, (first, *scale))) or not 0 <= first < 1 << 40:
        raise FileError(
            name, f"header has the offset {first} and the scale {scale}; the file is damaged, write it anew"
        )
    n_bytes = math.prod(shape) * _BYTES[code]
    needed = int(first) + n_bytes
    if not packed and len(data) < needed:
        raise _too_short(name, shape, needed, len(data))
    return ImageLayout(
        f"NIfTI-{2 if second else 1}",
        "vtkNIFTIImageReader",
        later=(lambda: _check_packed(name, data, shape, needed),) if packed else (),
        n_bytes=n_bytes,
        shape=shape,
        length_unit=_UNITS.get(units & 7, ""),
        frame="RAS",
    )


def _kind(name: str, head: bytes) -> tuple[str, bool]:
    """Byte order, and whether it is NIfTI-2."""
    for order in "<>":
        size = struct.unpack(f"{order}i", head[:4])[0] if len(head) >= 348 else 0
        if size == 348 or (size == 540 and len(head) == 540):
            mark = head[4:8] if size == 540 else head[344:348]
            if mark[:3] in (b"ni1", b"ni2"):
                raise FileError(name, "is the header of a pair of files (.hdr, .img); write both as one .nii")
            if mark[:3] == (b"n+2" if size == 540 else b"n+1"):
                return order, size == 540
    raise FileError(name, "has no whole header of a NIfTI file; check what wrote it")


def _shape(name: str, dims: tuple[int, ...]) -> tuple[int, int, int]:
    """Voxels along the three axes."""
    n_axes, sizes = dims[0], dims[1:]
    if not 2 <= n_axes <= 7 or min(sizes[:n_axes]) < 1:
        raise FileError(name, f"dimensions {list(dims)} are none of an image; the file is damaged, write it anew")
    further = math.prod(sizes[3:n_axes])
    if further > 1:
        raise FileError(name, f"holds {further} images (times or components); write the mask as a file of its own")
    return sizes[0], sizes[1], sizes[2] if n_axes > 2 else 1


def _too_short(name: str, shape: tuple[int, int, int], needed: int, there: int) -> FileError:
    """The error for a file that ends too early."""
    return FileError(
        name,
        f"declares {' x '.join(map(str, shape))} voxels, which end at byte {needed}, but has {there} bytes; "
        "the file is cut short, write it anew",
    )


def _unpacked_head(name: str, data: bytes) -> bytes:
    """The header of a packed file."""
    try:
        return zlib.decompressobj(wbits=31).decompress(data, 540)
    except zlib.error as error:
        raise FileError(name, f"cannot be unpacked ({error}); the file is damaged, write it anew") from None


def _check_packed(name: str, data: bytes, shape: tuple[int, int, int], needed: int) -> None:
    """Unpack everything, keep nothing: the length must be there and the check sum right."""
    unpacker, there, rest = zlib.decompressobj(wbits=31), 0, data
    try:
        while rest and not unpacker.eof and there <= needed + _SLACK:
            there += len(unpacker.decompress(rest, _CHUNK))
            rest = unpacker.unconsumed_tail
    except zlib.error as error:
        raise FileError(name, f"cannot be unpacked ({error}); the file is damaged, write it anew") from None
    if there > needed + _SLACK:
        raise FileError(
            name, f"unpacks to more than the {needed} bytes it declares; the file is damaged, write it anew"
        )
    if there < needed or not unpacker.eof:
        raise _too_short(name, shape, needed, there)
