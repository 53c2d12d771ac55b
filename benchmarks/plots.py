"""Vector plots for the page and the commands, as SVG text without outside parts."""

import io
import math
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from benchmarks.convergence import ADAPTIVE, Study
from benchmarks.numbers import Number

if TYPE_CHECKING:
    from benchmarks.timing import Timing

# Okabe and Ito's colours, told apart by colour-blind readers too.
COLOURS = {"dkt": "#d55e00", "hct": "#009e73", "quintic": "#0072b2"}
MARKERS = {"dkt": "s", "hct": "^", "quintic": "o"}
GREY = "#555555"
FLOOR = 1e-11


def convergence_plot(own: Study) -> str:
    """Error against unknowns, element by element, with the bands of adaptive runs."""
    figure, axes = _figure(7.2, 4.4)
    for series in own.series:
        x = [run.unknowns for run in series.runs]
        y = [max(run.error, FLOOR) for run in series.runs]
        colour, adaptive = COLOURS[series.element], series.meshes == ADAPTIVE
        order = series.order(10.0 * own.resolution)
        words = "" if order is None or adaptive else f", order {order:.1f}"
        axes.loglog(
            x, y, color=colour, marker=MARKERS[series.element], markersize=4.5,
            linestyle="--" if adaptive else "-", linewidth=1.3,
            markerfacecolor="white" if adaptive else colour,
            label=f"{series.element}, {series.meshes}{words}",
        )  # fmt: skip
        if adaptive:
            bands = [run.half_band for run in series.runs]
            axes.loglog(
                x, bands, color=colour, linestyle=":", linewidth=1.3,
                label=f"{series.element}, half band",
            )  # fmt: skip
    axes.axhline(own.resolution, color=GREY, linewidth=0.8)
    axes.text(
        0.99, own.resolution, "value known to here", transform=_across(axes),
        ha="right", va="bottom", fontsize=8, color=GREY,
    )  # fmt: skip
    axes.set_xlabel("free unknowns")
    axes.set_ylabel("error, as a share of the value")
    axes.set_title(f"{own.case}: {own.words}", fontsize=10)
    axes.grid(True, which="major", linewidth=0.4, color="#cccccc")
    figure.legend(
        *axes.get_legend_handles_labels(), fontsize=8, frameon=False,
        loc="outside right upper",
    )  # fmt: skip
    return _svg(figure)


def deviation_plot(numbers: Sequence[Number]) -> str:
    """Deviation of every number from its value, family by family."""
    names = list(dict.fromkeys(number.family for number in numbers))
    figure, axes = _figure(7.2, 0.32 * len(names) + 1.0)
    styles = (("with a band", True, COLOURS["quintic"], -0.16),
              ("without", False, COLOURS["dkt"], 0.16))  # fmt: skip
    for label, banded, colour, aside in styles:
        x, y = [], []  # one line of short strokes, which keeps the file small
        for n in numbers:
            if n.value is not None and (n.kind != "none") == banded:
                middle = names.index(n.family) + aside
                x += [max(abs(n.deviation), 1e-10)] * 2 + [math.nan]
                y += [middle - 0.13, middle + 0.13, math.nan]
        axes.plot(x, y, color=colour, linewidth=1.0, label=label, alpha=0.8)
    axes.axvline(1e-3, color=GREY, linewidth=0.9)
    axes.set_xscale("log")
    axes.set_xlim(0.5e-10, 0.5)
    axes.set_yticks(range(len(names)), names, fontsize=8.5)
    axes.invert_yaxis()
    axes.set_xlabel("deviation from the value, as a share (grey line: 0.1 %)")
    axes.grid(True, axis="x", linewidth=0.4, color="#cccccc")
    axes.legend(fontsize=8, loc="upper left")
    return _svg(figure)


def timing_plot(timings: Sequence["Timing"]) -> str:
    """Seconds of each stage against unknowns."""
    figure, axes = _figure(7.2, 4.2)
    marks = "ovs^D<>pP*X"
    for k, stage in enumerate(timings[0].stages):
        axes.loglog(
            [t.unknowns for t in timings], [t.stages[stage] for t in timings],
            marker=marks[k % len(marks)], markersize=4, linewidth=1.0, label=stage,
        )  # fmt: skip
    axes.loglog(
        [t.unknowns for t in timings], [t.bare for t in timings],
        color="black", linewidth=1.6, label="bare factorisation",
    )  # fmt: skip
    axes.set_xlabel("unknowns")
    axes.set_ylabel("seconds")
    axes.grid(True, which="major", linewidth=0.4, color="#cccccc")
    figure.legend(
        *axes.get_legend_handles_labels(), fontsize=8, frameon=False,
        loc="outside right upper",
    )  # fmt: skip
    return _svg(figure)


def _figure(width: float, height: float) -> tuple[Any, Any]:
    from matplotlib.figure import Figure

    figure = Figure(figsize=(width, height), layout="constrained")
    axes = figure.add_subplot()
    axes.spines[["top", "right"]].set_visible(False)
    axes.tick_params(which="minor", length=0)
    return figure, axes


def _across(axes: Any) -> Any:
    """Shares of the width across, data upwards."""
    return axes.get_yaxis_transform()


def _svg(figure: Any) -> str:
    from matplotlib import rc_context

    for axes in figure.axes:
        axes.minorticks_off()
    stream = io.StringIO()
    with rc_context({"svg.fonttype": "none", "svg.hashsalt": "kplate"}):
        figure.savefig(stream, format="svg", metadata={"Date": None, "Creator": None})
    text = stream.getvalue()
    return text[text.index("<svg") :]
