"""A figure as PNG and SVG, the same bytes each time."""

from __future__ import annotations

import io
import warnings
from typing import Any

import matplotlib as mpl
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.backends.backend_svg import FigureCanvasSVG
from matplotlib.figure import Figure


def images(drawn: Figure) -> tuple[bytes, bytes]:
    """PNG and SVG of a figure; call inside `styled()`. Each is drawn once, where saving a figure draws it twice.

    Neither holds a date or a library version. A name in a script that the bundled typeface lacks is drawn as boxes,
    which is no reason to warn on the terminal.
    """
    png, svg = io.BytesIO(), io.BytesIO()
    raster: Any = FigureCanvasAgg(drawn)
    vector: Any = FigureCanvasSVG(drawn)
    with warnings.catch_warnings():
        warnings.filterwarnings("ignore", message="Glyph .* missing from")
        warnings.filterwarnings("ignore", message=".*constrained_layout not applied.*")
        drawn.set_dpi(mpl.rcParams["savefig.dpi"])
        raster.print_png(png, metadata={"Software": None})
        drawn.set_layout_engine("none")  # it stands: laid out once, for both
        vector.print_svg(svg, metadata={"Date": None, "Creator": None})
    return png.getvalue(), svg.getvalue()
