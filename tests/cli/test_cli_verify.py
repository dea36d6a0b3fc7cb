"""``transient verify``: rows, words and the exit status of a planted failure."""

from __future__ import annotations

import json
from dataclasses import replace

import pytest

import transient.trust.verification as verification
from transient.trust.verification import Row

ROWS = [
    Row(name="plates, sudden start", worst=1.25e-5, limit=1e-3, source="Some Book (1950), eq. 1", passed=True),
    Row(name="pipe, pressure step", worst=3.5e-6, limit=1e-4, source="Some Paper (1932)", passed=True),
]


@pytest.fixture
def rows(monkeypatch: pytest.MonkeyPatch) -> list[Row]:
    """The rows that the verification set returns; a test may spoil them."""
    made = list(ROWS)
    monkeypatch.setattr(verification, "verify", lambda solver: made)
    return made


def test_worst_error_beside_limit(call, rows):
    said = call("verify")
    lines = said.out.splitlines()
    assert said.status == 0
    assert lines[0].split() == ["what", "is", "checked", "worst", "error", "limit", "exact", "answer", "after"]
    assert " ".join(lines[1].split()) == "plates, sudden start ok 1.25e-05 1.00e-03 Some Book (1950), eq. 1"
    assert "every row is within its limit" in said.out
    assert "numba" in lines[-1]


def test_a_planted_failure_is_seen(call, rows):
    rows[1] = replace(rows[1], worst=2e-4, passed=False)
    said = call("verify")
    assert said.status == 1
    assert "FAILED" in said.out
    assert "1 outside their limit" in said.out


def test_json(call, rows):
    record = json.loads(call("verify", "--json").out)
    assert record["passed"] is True
    assert record["rows"][0] == {
        "name": "plates, sudden start",
        "worst_error": 1.25e-5,
        "limit": 1e-3,
        "source": "Some Book (1950), eq. 1",
        "passed": True,
    }
    assert record["versions"]["transient"]
    assert record["seconds"] >= 0.0
