"""The bytes of a file that was named by a person or by another file: ordinary files, of bearable size."""

from __future__ import annotations

import errno
import os
import stat
from os import PathLike

LARGEST_BYTES = 2**29  # ten times a reconstruction of a million rows
PIECE_BYTES = 2**20


def bytes_of(path: str | PathLike[str], pipes: bool = False) -> bytes:
    """All bytes of a file.

    A device such as /dev/zero never ends and a pipe without a writer never begins; a name that stands in a file shall
    not make the program wait for either.

    Args:
        path: the file.
        pipes: whether a pipe will do, as it may where a person names it.

    Raises:
        OSError: there is no such file, it cannot be opened, it is no ordinary file, or it is larger than
            `LARGEST_BYTES`.
        ValueError: the name is no name of a file.
    """
    found = os.stat(path)
    kind = found.st_mode
    if stat.S_ISDIR(kind):
        raise IsADirectoryError(errno.EISDIR, "it is a folder")
    if not (stat.S_ISREG(kind) or (pipes and stat.S_ISFIFO(kind))):
        raise OSError(errno.EINVAL, "it is a device or a pipe, no ordinary file")
    too_large = OSError(errno.EFBIG, f"it is larger than {LARGEST_BYTES >> 20} MB")
    if found.st_size > LARGEST_BYTES:
        raise too_large
    pieces, size = [], 0
    with open(path, "rb") as stream:
        while piece := stream.read(PIECE_BYTES):
            pieces.append(piece)
            size += len(piece)
            if size > LARGEST_BYTES:
                raise too_large
    return b"".join(pieces)
