"""Whether results can be written to a place: asked before anything is solved."""

from __future__ import annotations

import tempfile
from pathlib import Path


def nearest(folder: Path) -> Path:
    """The folder itself, or the nearest place above it that exists."""
    while not folder.exists() and folder.parent != folder:
        folder = folder.parent
    return folder


def unwritable(folder: Path) -> str | None:
    """Why nothing can be written to ``folder``, in a few words, or None: the nearest place is tried with a file that
    vanishes again."""
    place = nearest(folder)
    if not place.is_dir():
        return f"results go into a folder, and {place} is a file"
    try:
        with tempfile.TemporaryFile(dir=place):
            return None
    except OSError as error:
        return f"cannot be written ({error.strerror})"
