"""``python -m transient``: the same as the console program."""

from __future__ import annotations

import sys

from transient.cli import main

if __name__ == "__main__":
    sys.exit(main())
