"""The compile cache: used where it can be written, replaced or given up where it cannot."""

from __future__ import annotations

import os
import tempfile
from pathlib import Path

import numba
import pytest

from transient import compiled


def add(a, b):
    return a + b


@pytest.fixture
def no_choice(monkeypatch):
    """No folder named by the user."""
    monkeypatch.delenv("NUMBA_CACHE_DIR", raising=False)


def test_a_folder_named_by_the_user_is_left_alone(monkeypatch):
    monkeypatch.setenv("NUMBA_CACHE_DIR", "/somewhere/of/the/users")
    compiled._cache_folder()
    assert os.environ["NUMBA_CACHE_DIR"] == "/somewhere/of/the/users"


def test_where_the_usual_folders_can_be_written_nothing_is_set(no_choice):
    compiled._cache_folder()
    assert "NUMBA_CACHE_DIR" not in os.environ


def test_without_a_writable_folder_one_for_this_user_among_the_temporary_ones_is_taken(no_choice, monkeypatch):
    def refused(dir=None, **more):
        raise PermissionError(13, "Permission denied", dir)

    monkeypatch.setattr(tempfile, "TemporaryFile", refused)
    monkeypatch.setattr(os, "makedirs", lambda *a, **k: None)
    compiled._cache_folder()
    chosen = Path(os.environ.pop("NUMBA_CACHE_DIR"))
    assert chosen.parent == Path(tempfile.gettempdir())
    assert "transient" in chosen.name


def test_a_read_only_folder_that_cannot_even_be_made_is_passed_over(no_choice, monkeypatch):
    tried = []

    def read_only(folder, exist_ok=False):
        tried.append(folder)
        raise OSError(30, "Read-only file system", folder)

    monkeypatch.setattr(os, "makedirs", read_only)
    compiled._cache_folder()
    os.environ.pop("NUMBA_CACHE_DIR")
    assert len(tried) == 2


def test_functions_compile_and_are_cached_on_disk():
    function = compiled.compiled(add)
    assert function(2, 3) == 5
    assert type(function._cache).__name__ == "FunctionCache"


def test_without_any_place_for_a_cache_functions_compile_in_memory(monkeypatch):
    true = numba.njit
    asked = []

    def without_cache(*more, **options):
        asked.append(options.get("cache", False))
        if options.get("cache"):
            raise RuntimeError("cannot cache function: no locator available")
        return true(*more, **options)

    monkeypatch.setattr(numba, "njit", without_cache)
    function = compiled.compiled(add)
    assert function(2, 3) == 5
    assert asked == [True, False]


def test_kernels_release_the_interpreter_lock():
    assert compiled.compiled(add).targetoptions["nogil"] is True
