"""What happens between rest and steady running in a liquid-filled gap.

``read_case`` or ``Case`` states a case, ``run`` solves it, ``sweep`` solves many of them; ``write_result`` keeps and
``read_result`` opens what either left behind.  ``draw``, ``overlay`` and ``write_sheet`` show it.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from transient import sweep
    from transient.answer import run
    from transient.case.model import Case, CaseError
    from transient.case.read import read_case
    from transient.march.march import SolveError
    from transient.result.result import Result, ResultError
    from transient.result.store import write as write_result
    from transient.sheet.document.write import write_sheet
    from transient.sheet.figures import draw
    from transient.sheet.overlay import overlay
    from transient.sweep.table import Table
    from transient.sweep.table import read as read_result

# Loaded when first used, so that ``import transient`` stays light.
_WHERE = {
    "Case": ("transient.case.model", "Case"),
    "CaseError": ("transient.case.model", "CaseError"),
    "Result": ("transient.result.result", "Result"),
    "ResultError": ("transient.result.result", "ResultError"),
    "SolveError": ("transient.march.march", "SolveError"),
    "Table": ("transient.sweep.table", "Table"),
    "draw": ("transient.sheet.figures", "draw"),
    "overlay": ("transient.sheet.overlay", "overlay"),
    "read_case": ("transient.case.read", "read_case"),
    "read_result": ("transient.sweep.table", "read"),
    "run": ("transient.answer", "run"),
    "sweep": ("transient.sweep", ""),  # a room that can be called
    "write_result": ("transient.result.store", "write"),
    "write_sheet": ("transient.sheet.document.write", "write_sheet"),
}

__all__ = [
    "Case", "CaseError", "Result", "ResultError", "SolveError", "Table", "draw", "overlay", "read_case", "read_result",
    "run", "sweep", "write_result", "write_sheet",
]  # fmt: skip


def __getattr__(name: str) -> Any:
    if name == "__version__":
        from importlib.metadata import version

        return version("transient")
    if name not in _WHERE:
        raise AttributeError(f"module 'transient' has no attribute {name!r}")
    module, own = _WHERE[name]
    found = import_module(module)
    value = getattr(found, own) if own else found
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return sorted([*globals(), *__all__, "__version__"])
