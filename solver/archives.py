"""Reading ``.npz`` archives of any origin: what they claim is checked before memory is taken; nothing is unpickled."""

from __future__ import annotations

import math
import zipfile
from collections.abc import Iterable
from pathlib import Path

import numpy as np

from .errors import Trouble

MOST_BYTES = 16 << 30  # of all arrays together: far above 2e7 nodes, far below what a forged header claims
# Zeros of an honest archive pack a thousandfold, so that only large members are held to a ratio.
PACKED_FREELY, MOST_PACKED = 64 << 20, 100
HEADERS = {(1, 0): np.lib.format.read_array_header_1_0, (2, 0): np.lib.format.read_array_header_2_0}


def read_arrays(path: Path, required: Iterable[str], optional: Iterable[str] = ()) -> dict[str, np.ndarray]:
    """The named arrays of an ``.npz``.

    Raises Trouble of kind "case" that names the file, and the array at fault if there is one.
    """
    try:
        with zipfile.ZipFile(path) as archive:
            members = {info.filename.removesuffix(".npy"): info for info in archive.infolist()}
            missing = [name for name in required if name not in members]
            if missing:
                raise _trouble(path, f"lacks the array '{missing[0]}'")
            wanted = {name: members[name] for name in (*required, *optional) if name in members}
            _check_sizes(path, wanted)
            return {name: _read_array(archive, info) for name, info in wanted.items()}
    except Trouble:
        raise
    except OSError as error:
        reason = error.strerror or "it is not an .npz archive"
        raise Trouble("case", f"{path.name} cannot be read: {reason}.", f"Put {path.name} there.") from error
    except Exception as error:  # what a forged archive makes its readers raise is beyond listing
        raise _trouble(path, "is not a sound .npz archive") from error


def _check_sizes(path: Path, members: dict[str, zipfile.ZipInfo]) -> None:
    for name, info in members.items():
        if info.file_size > PACKED_FREELY + MOST_PACKED * info.compress_size:
            raise _trouble(path, f"packs the array '{name}' more tightly than arrays are")
    if sum(info.file_size for info in members.values()) > MOST_BYTES:
        raise _trouble(path, f"holds more than {MOST_BYTES >> 30} GB")


def _read_array(archive: zipfile.ZipFile, info: zipfile.ZipInfo) -> np.ndarray:
    """Raises ValueError, among much else, where the header does not fit what follows it."""
    with archive.open(info) as stream:
        shape, _, dtype = HEADERS[np.lib.format.read_magic(stream)](stream)
        if dtype.hasobject or min(shape, default=0) < 0:
            raise ValueError("not an array of numbers")
        if math.prod(shape) * dtype.itemsize != info.file_size - stream.tell():
            raise ValueError("the header claims another size than there is")
    with archive.open(info) as stream:
        return np.lib.format.read_array(stream, allow_pickle=False)


def _trouble(path: Path, complaint: str) -> Trouble:
    return Trouble("case", f"{path.name} {complaint}.", "Write it again.")


def shaped(array: np.ndarray, shape: tuple[int | None, ...], kinds: str) -> bool:
    """Whether an array has that shape, None for any length, and a dtype of those kinds ("f", "iu")."""
    fits = array.ndim == len(shape) and all(want in (None, has) for want, has in zip(shape, array.shape, strict=True))
    return fits and array.dtype.kind in kinds
