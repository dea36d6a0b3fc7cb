"""Places in TOML text, and TOML text from a tree: against the standard library's reader."""

from __future__ import annotations

import tomllib
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from transient.case.lines import find_lines
from transient.case.write import to_toml

TEXT = '''\
# comment with [brackets] and "quotes"
title = "a # no comment" # a comment
a.b.'c d' = 1

[table]  # [not.this]
  list = [ 1,   # one
    2, { x = 1, y = [
      3 ] },
  ]
text = """
[not.a.table]
k = 1 \\""" ""
"""
raw = \'\'\'
x = "\'\'
\'\'\'
after = true
[ table . "in ner" ]
date = 2020-01-01T00:00:00Z
[[array]]
x = 1
[[array]]
x = 2
[array.sub]
y = {a={b=1},c=2}
'''


def test_every_kind_of_place_is_found() -> None:
    lines = find_lines(TEXT)
    expected = {
        ("title",): 2, ("a",): 3, ("a", "b", "c d"): 3, ("table",): 5, ("table", "list"): 6, ("table", "list", 0): 6,
        ("table", "list", 1): 7, ("table", "list", 2, "x"): 7, ("table", "list", 2, "y"): 7,
        ("table", "list", 2, "y", 0): 8, ("table", "text"): 10, ("table", "raw"): 14, ("table", "after"): 17,
        ("table", "in ner"): 18, ("table", "in ner", "date"): 19, ("array", 0, "x"): 21, ("array", 1, "x"): 23,
        ("array", 1, "sub"): 24, ("array", 1, "sub", "y", "a", "b"): 25, ("array", 1, "sub", "y", "c"): 25,
    }  # fmt: skip
    assert {path: lines.get(path) for path in expected} == expected


def paths(node: Any, path: tuple[str | int, ...] = ()) -> set[tuple[str | int, ...]]:
    """All paths of a parsed tree."""
    found = {path} if path else set()
    items = node.items() if isinstance(node, dict) else enumerate(node) if isinstance(node, list) else ()
    for key, item in items:
        found |= paths(item, (*path, key))
    return found


def test_the_places_are_those_of_the_tree() -> None:
    assert set(find_lines(TEXT)) == paths(tomllib.loads(TEXT))


SEEDED = settings(derandomize=True, database=None, deadline=None, max_examples=60)
KEYS = st.sampled_from(["gap", "wall", "upper", "body", "speed", "a b", 'quo"te', "x.y", "ü"])
LEAVES = st.one_of(
    st.text("ab #'=[]{},.\"\\\n\t\r\x01\x7fßλ", max_size=12),
    st.integers(-(2**60), 2**60), st.floats(allow_nan=False, allow_infinity=False), st.booleans(),
)  # fmt: skip
TREES = st.dictionaries(
    KEYS,
    st.recursive(LEAVES, lambda c: st.lists(c, max_size=3) | st.dictionaries(KEYS, c, max_size=3), max_leaves=8),
    max_size=4,
)


@SEEDED
@given(TREES)
def test_written_text_reads_back_exactly(tree: dict[str, Any]) -> None:
    text = to_toml(tree)
    assert tomllib.loads(text) == tree
    assert to_toml(tomllib.loads(text)) == text


@SEEDED
@given(TREES)
def test_places_of_written_text(tree: dict[str, Any]) -> None:
    found = find_lines(to_toml(tree))
    assert paths(tree) <= set(found)


def test_floats_and_whole_numbers_stay_what_they_are() -> None:
    tree = tomllib.loads(to_toml({"a": 1.0, "b": 1, "c": 1e-300, "d": 0.1 + 0.2}))
    assert [type(v) for v in tree.values()] == [float, int, float, float]
    assert tree["d"] == 0.1 + 0.2


def test_what_has_no_form_is_refused() -> None:
    with pytest.raises(TypeError):
        to_toml({"a": object()})
