"""The case behind a result, read again from the text that the result keeps."""

from __future__ import annotations

import tomllib

from transient.case.model import Case, CaseError
from transient.result.result import Result, ResultError


def case_of(result: Result) -> Case | None:
    """The case; None where this version does not read it."""
    try:
        return Case(tomllib.loads(result.case_text))
    except (CaseError, ValueError):
        return None


def needed_case(result: Result, figure: str) -> Case:
    """The case that a figure cannot be drawn without.  Raises ResultError."""
    case = case_of(result)
    if case is None:
        raise ResultError(f"figure {figure}: needs the case, and this version does not read that of this file")
    return case
