"""A small drawing of a plate and what holds it, as SVG that `STYLE` goes with."""

import kplate as kp

# Class of a side by its support, and how it is drawn.
STROKES = {"clamped": "kc", "simply supported": "ks", "guided": "kg", "free": "kf"}
STYLE = """.kc,.ks,.kg,.kf{fill:none}.kc{stroke:#111;stroke-width:3.2}
.ks{stroke:#0072b2;stroke-width:1.8}.kf{stroke:#999;stroke-width:.9}
.kg{stroke:#009e73;stroke-width:1.8;stroke-dasharray:4 2}.km{fill:#0072b2}
"""
SIZE, EDGE = 46.0, 4.0  # pixels


def thumbnail(plate: kp.Plate) -> str:
    """The outline with its sides by support, held seams and marks, 46 pixels wide."""
    west, south, east, north = plate.outline.box
    scale = (SIZE - 2 * EDGE) / max(east - west, north - south)
    height = scale * (north - south) + 2 * EDGE

    def at(point: tuple[float, float]) -> str:
        x = EDGE + scale * (point[0] - west)
        y = height - EDGE - scale * (point[1] - south)
        return f"{x:.1f} {y:.1f}"

    parts = []
    for line in plate.outline.boundaries:
        pieces = zip(
            line.points, line.ends, line.bulges, line.circles, line.sides, strict=True
        )
        for start, end, bulge, circle, name in pieces:
            step = f"L{at(end)}"
            if bulge:
                r = scale * circle[2]
                # SVG's y runs down: a turn to the left is a sweep of 0.
                large, sweep = int(abs(bulge) > 1.0), int(bulge < 0.0)
                step = f"A{r:.1f} {r:.1f} 0 {large} {sweep} {at(end)}"
            parts.append(_path(f"M{at(start)}{step}", plate.support(name).name))
    for seam in plate.outline.seams:
        way = "L".join(at(point) for point in seam.chords)
        parts.append(_path(f"M{way}", plate.support(seam.name).name))
    for mark in plate.outline.marks:
        x, y = at(mark.at).split()
        parts.append(f"<circle class=km cx={x} cy={y} r=2.4 />")
    box = f'viewBox="0 0 {SIZE:.0f} {height:.0f}" width="{SIZE:.0f}"'
    return f"<svg {box}>{''.join(parts)}</svg>"


def _path(way: str, support: str) -> str:
    return f'<path class={STROKES[support]} d="{way}"/>'
