"""Times as (piece, offset) of the pieces that an exact solution counts by."""

from __future__ import annotations

import numpy as np


class Located:
    """A solution whose pieces begin at ``starts`` (P,) s."""

    starts: np.ndarray

    def locate(self, t: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(piece, offset) of times ``t`` (n,) >= 0; at a break the later piece."""
        t = np.asarray(t, dtype=float)
        piece = np.clip(np.searchsorted(self.starts, t, side="right") - 1, 0, None)
        return piece, t - self.starts[piece]
