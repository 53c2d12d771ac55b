"""The way to a tolerance as a picture: half width of each band against unknowns."""

from pathlib import Path

from kplate.answers import NO_BAND
from kplate.errors import InputError
from kplate.files import replacing
from kplate.solution import Solution

SIZE = (8.0, 5.0)  # inches
LEAST = 1e-12  # narrower bands are drawn there


def write_history(solution: Solution, path: Path) -> Path:
    """Draw the bands of a solution's goals, mesh by mesh.

    Parameters
    ----------
    solution : Solution
        One that was solved to a tolerance.
    path : Path
        The file: ``.png``, ``.svg`` or ``.pdf``.

    Returns
    -------
    Path
        The file.

    Raises
    ------
    InputError
        If the solution has no history, or the file cannot be written.
    """
    if not solution.history or solution.tolerance is None:
        raise InputError(
            "the plate was solved on a single mesh; call solve(..., tolerance=...)."
        )
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    path = Path(path)
    if path.suffix not in (".png", ".svg", ".pdf"):
        raise InputError(f"{str(path)!r} must end in .png, .svg or .pdf; name it so.")
    drawn = Figure(figsize=SIZE, layout="constrained")
    FigureCanvasAgg(drawn)
    axes = drawn.add_subplot()
    unknowns = [step.unknowns for step in solution.history]
    for name in solution.history[-1].bands:
        widths = [
            100.0 * max(step.bands.get(name, LEAST), LEAST) for step in solution.history
        ]
        if max(widths) > 100.0 * LEAST:
            axes.loglog(unknowns, widths, marker="o", label=name)
    if not solution.history[-1].bands:
        axes.set_title(NO_BAND)
    axes.axhline(
        100.0 * solution.tolerance, color="0.3", linestyle="--", label="tolerance"
    )
    axes.set_xlabel("unknowns of the plate")
    axes.set_ylabel("half width of the band [% of the value]")
    axes.grid(visible=True, which="both", color="0.9")
    axes.legend(loc="center left", bbox_to_anchor=(1.0, 0.5), frameon=False)
    with replacing(path) as temporary:
        drawn.savefig(temporary, format=path.suffix[1:], dpi=120)
    return path
