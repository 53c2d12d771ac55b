"""The plot of a section in a corner of the window."""

from typing import Any

import numpy as np

from kplate.output.probing import Section
from kplate.units import Unit

SIZE, PLACE = (0.47, 0.3), (0.52, 0.02)  # shares of the view


def draw_chart(plotter: Any, cut: Section | None, title: str, length: Unit) -> None:
    """Plot a section, in place of the one before; nothing for none."""
    for chart in list(plotter.renderer._charts or ()):
        plotter.remove_chart(chart)
    if cut is None:
        return
    import pyvista

    chart = pyvista.Chart2D(
        size=SIZE, loc=PLACE, x_label=f"along the section [{length.symbol}]"
    )
    chart.y_label = title
    chart.background_color = (1.0, 1.0, 1.0, 0.9)
    # One line for each stretch on the plate: a hole is a gap.
    along = cut.pieces / length.size
    step = along[1:, 0] - along[:-1, 1]
    breaks = np.flatnonzero(step > 1e-6 * np.ptp(along)) + 1
    for own, values in zip(
        np.split(along, breaks), np.split(cut.values, breaks), strict=True
    ):
        chart.line(own.ravel(), values.ravel(), color="#1a1a1a", width=2.0)
    plotter.add_chart(chart)
