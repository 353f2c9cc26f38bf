"""A figure that a notebook shows by itself; in all else it is matplotlib's own."""

from __future__ import annotations

import io

from matplotlib.figure import Figure

NOTEBOOK_DPI = 160


class ShownFigure(Figure):
    """A matplotlib figure with a picture for notebooks, which know figures only once pyplot is loaded."""

    def _repr_png_(self) -> bytes:
        """The picture."""
        from cable.desk.figures.style import styled

        stream = io.BytesIO()
        with styled():
            self.savefig(stream, format="png", dpi=NOTEBOOK_DPI)
        return stream.getvalue()
