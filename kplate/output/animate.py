"""Moving pictures: load cases one after the other, or a load that grows.

Each frame is the plan that `plot` draws. Colours mean the same in all frames, and each
states its case or the factor on the loads. The deflection of a thin plate is linear: at
a factor on the loads every field is that many times larger.
"""

from collections.abc import Sequence
from io import BytesIO
from pathlib import Path
from typing import Any

import numpy as np

from kplate.arrays import Floats
from kplate.errors import InputError
from kplate.files import replacing
from kplate.loads import DiscPatch, PointForce, RectanglePatch
from kplate.output.colours import colours
from kplate.output.plot import (
    draw_field,
    draw_outline,
    find_shade,
    new_axes,
)
from kplate.output.result import Result, fields_of
from kplate.output.shades import Shade
from kplate.solution import Solution

FORMATS = {".gif": "GIF", ".png": "PNG"}  # .png: APNG, frames in a PNG file
DPI = 90
MOST_FRAMES = 400


def write_animation(
    solution: Solution,
    path: Path,
    *,
    quantity: str = "deflection",
    face: str = "bottom",
    cases: Sequence[str] | None = None,
    factors: Sequence[float] | None = None,
    seconds: float = 0.4,
) -> Path:
    """Write a moving picture of load cases, or of one case whose loads grow.

    A patch that roams is a solution with a case for each of its places.

    Parameters
    ----------
    solution : Solution
        What to draw.
    path : Path
        The file: ``.gif``, or ``.png`` for an animated PNG.
    quantity : str
        What the colours mean, as in `plot`.
    face : {"bottom", "top"}
        The face, of stresses.
    cases : sequence of str, optional
        The cases in their order; all if left out.
    factors : sequence of float, optional
        Factors on the loads of the one case, a frame each, instead; none negative.
    seconds : float
        How long a frame stays.

    Returns
    -------
    Path
        The file.

    Raises
    ------
    InputError
        If the name has another ending, there is no such case or quantity, there are
        less than two frames, or the file cannot be written.
    """
    path = Path(path)
    if path.suffix not in FORMATS:
        raise InputError(f"{str(path)!r} must end in .gif or .png; name it so.")
    if seconds <= 0.0:
        raise InputError(f"a frame stays {seconds:g} s; it must be a positive time.")
    names = list(solution.cases if cases is None else cases)
    for name in names:
        if name not in solution.cases:
            raise InputError(
                f"there is no load case {name!r}; the cases are "
                f"{', '.join(solution.cases)}."
            )
    result = fields_of(solution)
    shade = find_shade(result, quantity)
    frames = _frames(result, shade, face, names, factors)
    if not 1 < len(frames) <= MOST_FRAMES:
        raise InputError(
            f"there are {len(frames)} frames; a moving picture has 2 to {MOST_FRAMES}: "
            "give several cases, or factors on the loads of one."
        )
    judged = np.concatenate([values[own] for _, values, own, _ in frames])
    images = [_image(solution, result, shade, face, frame, judged) for frame in frames]
    kind = FORMATS[path.suffix]
    with replacing(path) as temporary:
        images[0].save(
            temporary,
            format=kind,
            save_all=True,
            append_images=images[1:],
            duration=round(1000.0 * seconds),
            loop=0,
        )
    return path


Frame = tuple[str, Floats, Any, str]  # words, values, which are judged, case


def _frames(
    result: Result,
    shade: Shade,
    face: str,
    names: Sequence[str],
    factors: Sequence[float] | None,
) -> list[Frame]:
    if factors is None:
        return [
            (
                f"case {k} of {len(names)}: {name}",
                result.shown(name, shade, face),
                result.judged(name),
                name,
            )
            for k, name in enumerate(names, 1)
        ]
    if len(names) != 1:
        raise InputError(
            f"factors are on the loads of one case, and there are {len(names)}; name "
            "one in cases=[...]."
        )
    values, judged = result.shown(names[0], shade, face), result.judged(names[0])
    if min(factors, default=0.0) < 0.0:
        raise InputError(
            f"the factors are {', '.join(f'{factor:g}' for factor in factors)}; they "
            "must not be negative, as stresses would change their kind."
        )
    return [
        (
            f"case {names[0]}, loads x {factor:.3g}",
            factor * values,
            judged,
            names[0],
        )
        for factor in factors
    ]


def _image(
    solution: Solution,
    result: Result,
    shade: Shade,
    face: str,
    frame: Frame,
    every: Floats,
) -> Any:
    """One frame as an image."""
    from PIL import Image

    words, values, judged, case = frame
    chosen = colours(every, values)
    axes = new_axes()
    draw_field(axes, result, (values, judged), chosen, shade.title(face))
    draw_outline(axes, solution.plate, result.units)
    _draw_patches(axes, solution, case, result.units.length.size)
    axes.set_title(words, fontsize="medium", loc="left")
    content = BytesIO()
    axes.figure.savefig(content, format="png", dpi=DPI)
    content.seek(0)
    with Image.open(content) as image:
        return image.convert("RGB").quantize(colors=128)


def _draw_patches(axes: Any, solution: Solution, case: str, size: float) -> None:
    """Outline patches of the case, cross point forces."""
    loads = solution.state.cases[solution.cases.index(case)].loads
    for load in loads:
        style = {"color": "#b35900", "linewidth": 1.8}
        if isinstance(load, RectanglePatch):
            line = np.array([*load.corners, load.corners[0]]) / size
            axes.plot(*line.T, **style)
        elif isinstance(load, DiscPatch):
            angle = np.linspace(0.0, 2.0 * np.pi, 60)
            x, y = np.array(load.centre) / size
            r = load.radius / size
            axes.plot(x + r * np.cos(angle), y + r * np.sin(angle), **style)
        elif isinstance(load, PointForce):
            axes.plot(*np.array(load.at) / size, marker="v", color="#b35900")
