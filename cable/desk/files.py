"""Writing results: whole or not at all, never over an input, never over a file without being told to."""

from __future__ import annotations

import errno
import os
import tempfile
from collections.abc import Iterable, Iterator
from contextlib import contextmanager, suppress
from dataclasses import dataclass
from pathlib import Path
from typing import IO, Any

from cable.desk.messages import DeskError, choices, shown


@dataclass(frozen=True)
class Output:
    """A file that may be written: made by `output`, which checks it before anything long is computed.

    Attributes:
        path: where the result goes.
        ending: the file's ending in lower case, with its dot.
        force: whether an existing file may be replaced.
    """

    path: Path
    ending: str
    force: bool = False

    @contextmanager
    def writing(self, text: bool = False) -> Iterator[IO[Any]]:
        """A stream to a temporary name in the same folder, which becomes the file when all is written.

        Raises:
            DeskError: the file cannot be written, or came into being meanwhile.
        """
        with _clear_errors(self.path):
            handle, temporary = tempfile.mkstemp(
                dir=self.path.parent, prefix=f".{self.path.name[:100]}.", suffix=".part"
            )
            try:
                mode, encoding = ("w", "utf-8") if text else ("wb", None)
                with os.fdopen(handle, mode, encoding=encoding, newline="" if text else None) as stream:
                    yield stream
                os.chmod(temporary, 0o666 & ~_umask())
                if self.path.exists() and not self.force:
                    raise _exists(self.path)
                os.replace(temporary, self.path)
            except BaseException:
                with suppress(OSError):
                    os.unlink(temporary)
                raise


def output(
    path: str | os.PathLike[str],
    endings: Iterable[str],
    force: bool = False,
    inputs: Iterable[str | os.PathLike[str]] = (),
) -> Output:
    """Check that a result may be written to `path`.

    Args:
        endings: the endings that are known, with their dots.
        force: replace an existing file.
        inputs: files that were read and must never be written.

    Raises:
        DeskError: unknown ending, an input file, an existing file without `force`, a folder that is
            missing or cannot be written.
    """
    given = Path(path)
    ending = given.suffix.lower()
    if ending not in endings:
        found = f"ends in {shown(ending)}" if ending else "has no ending"
        known = choices(list(endings))
        raise DeskError(f"{shown(given)}: the output {found}, expected {known}; the ending chooses the format")
    with _clear_errors(given):
        target = given.resolve()
        if target.is_dir():
            raise DeskError(f"{shown(given)}: is a folder, expected the name of a file to write")
        for source in inputs:
            if target == Path(source).resolve() or (target.exists() and os.path.samefile(target, source)):
                raise DeskError(f"{shown(given)}: is an input of this run and is never written; choose another name")
        if target.exists() and not force:
            raise _exists(given)
        check_folder(target.parent, given)
    return Output(target, ending, force)


def check_folder(folder: Path, asked_for: Path) -> None:
    """Raise DeskError unless `folder` exists and a file can be made in it."""
    if not folder.is_dir():
        raise DeskError(f"{shown(asked_for)}: there is no folder {shown(folder)}; make it first or choose another")
    if not os.access(folder, os.W_OK | os.X_OK):
        raise DeskError(f"{shown(asked_for)}: the folder {shown(folder)} cannot be written to; choose another")


def _exists(path: Path) -> DeskError:
    return DeskError(f"{shown(path)}: exists already; choose another name, or replace it with --force")


def _umask() -> int:
    current = os.umask(0)
    os.umask(current)
    return current


@contextmanager
def _clear_errors(path: Path) -> Iterator[None]:
    """Turn the system's refusals into messages."""
    try:
        yield
    except OSError as error:
        reasons = {
            errno.ENOSPC: "the disk is full; nothing was kept",
            errno.EDQUOT: "the disk quota is used up; nothing was kept",
            errno.EACCES: "permission denied; choose another folder",
            errno.EROFS: "the folder is read-only; choose another",
            errno.EFBIG: "the file would be larger than is allowed here; nothing was kept",
            errno.ELOOP: "the name is a link that leads to itself; choose another",
            errno.ENAMETOOLONG: "the name is too long; choose a shorter one",
        }
        reason = reasons.get(error.errno or 0, error.strerror or str(error))
        raise DeskError(f"{shown(path)}: cannot be written: {reason}") from None
    except RuntimeError as error:  # how Python up to 3.12 tells of links in a circle
        if "loop" not in str(error):
            raise
        raise DeskError(f"{shown(path)}: cannot be written: the name is a link that leads to itself") from None
    except ValueError as error:
        if "null" not in str(error):
            raise
        raise DeskError(f"{shown(path)}: is not the name of a file") from None
