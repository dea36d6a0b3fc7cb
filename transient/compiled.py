"""The one way this project compiles functions: cached on disk where that works, in memory where it does not."""

from __future__ import annotations

import os
import tempfile
import warnings
from collections.abc import Callable
from typing import Any


def _cache_folder() -> None:
    """Give the compiler a folder it can write, unless the user has named one or the usual ones work."""
    if os.environ.get("NUMBA_CACHE_DIR"):
        return
    here = os.path.join(os.path.dirname(os.path.abspath(__file__)), "__pycache__")
    home = os.path.join(os.path.expanduser("~"), ".cache")
    for folder in (here, home):
        try:
            os.makedirs(folder, exist_ok=True)
            with tempfile.TemporaryFile(dir=folder):
                pass
        except OSError:
            continue
        return
    user = getattr(os, "getuid", int)()
    os.environ["NUMBA_CACHE_DIR"] = os.path.join(tempfile.gettempdir(), f"transient-compiled-{user}")


_cache_folder()

import numba  # noqa: E402  (the cache folder must be known before)

OPTIONS: dict[str, Any] = {"nogil": True, "error_model": "numpy", "fastmath": {"contract", "reassoc"}}


def compiled(function: Callable[..., Any]) -> Callable[..., Any]:
    """Compile for plain arrays, without the interpreter lock, cached on disk where a folder can be written."""
    try:
        return numba.njit(cache=True, **OPTIONS)(function)
    except RuntimeError:  # no place to keep the cache: compile in memory for this process
        warnings.filterwarnings("default", category=numba.NumbaWarning)
        return numba.njit(**OPTIONS)(function)


# For functions that compiled ones call: left to the compiler back end to merge, since merging by hand (numba's own
# inlining) makes compilation several times longer.
part = numba.njit(**OPTIONS)
