"""A figure as PNG and SVG, the same bytes each time."""

from __future__ import annotations

import io
import warnings

from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.backends.backend_svg import FigureCanvasSVG
from matplotlib.figure import Figure


def images(drawn: Figure) -> tuple[bytes, bytes]:
    """PNG and SVG of a figure; call inside `styled()`.

    Neither holds a date or a library version. A name in a script that the bundled typeface lacks is drawn as boxes,
    which is no reason to warn on the terminal.
    """
    png, svg = io.BytesIO(), io.BytesIO()
    with warnings.catch_warnings():
        warnings.filterwarnings("ignore", message="Glyph .* missing from")
        warnings.filterwarnings("ignore", message=".*constrained_layout not applied.*")
        FigureCanvasAgg(drawn)
        drawn.savefig(png, format="png", metadata={"Software": None})
        FigureCanvasSVG(drawn)
        drawn.savefig(svg, format="svg", metadata={"Date": None, "Creator": None})
    return png.getvalue(), svg.getvalue()
