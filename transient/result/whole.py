"""Files that appear whole or not at all: written beside their place, then renamed."""

from __future__ import annotations

import os
import secrets
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from pathlib import Path

from transient.result.result import ResultError


@contextmanager
def whole(path: str | os.PathLike[str]) -> Iterator[Path]:
    """Yields a name beside ``path`` to write to; on leaving, that file takes the place of ``path`` at once.

    If the block raises, ``path`` is as it was before and nothing of the attempt remains.  Raises ResultError
    where the system refuses to write.
    """
    target = Path(path)
    draft = target.with_name(f".{target.stem}.{os.getpid()}-{secrets.token_hex(4)}.part{target.suffix}")
    try:
        yield draft
        with open(draft, "r+b") as file:
            # Without this a power cut could leave the new name over empty contents.
            os.fsync(file.fileno())
        os.replace(draft, target)
    except BaseException as error:
        with suppress(OSError):
            draft.unlink()
        if isinstance(error, OSError):
            raise ResultError(f"{target} cannot be written: {reason(error)}") from error
        raise


def reason(error: OSError) -> str:
    """The system's own words for the cause, without the library's wrapping, in one line."""
    if error.errno:
        return os.strerror(error.errno).lower()
    return (str(error).splitlines() or [type(error).__name__])[0]
