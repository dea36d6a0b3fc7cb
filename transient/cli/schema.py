"""``transient schema``: the JSON Schema of the case file, for editors."""

from __future__ import annotations

import json

from transient.cli.words import GOOD, Version, say


def schema(version: Version = False) -> int:
    """Print the JSON Schema of the case file.

    Editors complete and check with it.
    """
    from transient.case.schema import schema as case_schema

    say(json.dumps(case_schema(), indent=2, ensure_ascii=False))
    return GOOD
