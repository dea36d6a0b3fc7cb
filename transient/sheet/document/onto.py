"""A finished figure drawn as it is, as paths, at a place on a page of another."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from transient.sheet.document.blocks import Picture

if TYPE_CHECKING:
    from matplotlib.figure import Figure

PDF_DOTS = 72.0  # of the backend, per inch


def onto(page: Figure, picture: Picture, corner: tuple[float, float]) -> None:
    """Puts the picture's figure on ``page``, its lower left ``corner`` in inches, without what lies in its ``crop``.

    The figure's box is moved as a whole, so that nothing in it need know; it is of no other use afterwards.
    """
    from matplotlib.artist import Artist

    figure = picture.figure
    wide, tall = figure.get_size_inches()
    for text in figure.texts:
        if (1.0 - text.get_position()[1]) * tall < picture.crop:
            text.set_visible(False)
    figure.patch.set_visible(False)
    figure.set_dpi(PDF_DOTS)
    figure.bbox_inches.set_points(np.array([corner, (corner[0] + wide, corner[1] + tall)]))

    class Placed(Artist):
        """Draws the figure where the page is drawn."""

        def draw(self, renderer) -> None:
            figure.draw(renderer)

    page.add_artist(Placed())
