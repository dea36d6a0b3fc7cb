"""What the user states: TOML text in, a validated case out."""

from __future__ import annotations
