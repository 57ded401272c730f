"""Write files whole or not at all, and read them up to a stated size."""

import contextlib
import os
import stat
import tempfile
from pathlib import Path

from colure.errors import ColureError


class FileError(ColureError):
    """A file that cannot be written or read."""


def _reason(fault: OSError) -> str:
    return (fault.strerror or str(fault)).casefold()


def atomic_write(path: Path | str, data: bytes | str) -> None:
    """Write bytes, or text as UTF-8, to a temporary neighbour and rename it; an old file stays whole until then.

    A link is followed, the permissions of an old file are kept, and a device such as /dev/null is written directly.
    Raises FileError with the path and the reason.
    """
    where = Path(path)
    body = data.encode() if isinstance(data, str) else data
    try:
        target = Path(os.path.realpath(where))
        mode: int | None = None
        with contextlib.suppress(FileNotFoundError):
            status = target.stat()
            mode = stat.S_IMODE(status.st_mode)
            if stat.S_ISDIR(status.st_mode):
                raise IsADirectoryError(None, "it is a folder")
            if not stat.S_ISREG(status.st_mode):
                target.write_bytes(body)
                return
            if not os.access(target, os.W_OK):
                raise PermissionError(None, "permission denied")
        _replace(target, body, mode)
    except OSError as fault:
        raise FileError(f"file '{where}': cannot be written, {_reason(fault)}") from None
    except ValueError as fault:  # a path with a null character
        raise FileError(f"file {str(where)!r}: cannot be written, {fault}") from None


def _replace(target: Path, body: bytes, mode: int | None) -> None:
    handle, name = tempfile.mkstemp(prefix=f".{target.name[:100]}.", suffix=".part", dir=target.parent)
    try:
        with os.fdopen(handle, "wb") as file:
            file.write(body)
            file.flush()
            os.fsync(file.fileno())
        if mode is None:
            # mkstemp makes a private file: give it what an ordinary new file would have.
            mask = os.umask(0)
            os.umask(mask)
            mode = 0o666 & ~mask
        os.chmod(name, mode)
        os.replace(name, target)
    except BaseException:
        with contextlib.suppress(OSError):
            os.unlink(name)
        raise


def read_bounded(path: Path | str, limit: int) -> bytes:
    """Return the bytes of a file of at most `limit` bytes; FileError with the path and the reason otherwise."""
    where = Path(path)
    try:
        with where.open("rb") as file:
            # One byte more than allowed tells a file that is too large, even one that grows or has no size.
            data = file.read(limit + 1)
    except OSError as fault:
        raise FileError(f"file '{where}': cannot be read, {_reason(fault)}") from None
    except ValueError as fault:
        raise FileError(f"file {str(where)!r}: cannot be read, {fault}") from None
    if len(data) > limit:
        raise FileError(f"file '{where}': more than {limit:,} bytes; expected at most that many")
    return data
