"""The lines above every result: identity, and the panel as it was understood."""

import numpy as np

from kplate.checklines import place_words, short
from kplate.describe import describe
from kplate.limits import StressLimit
from kplate.limitwords import stated_lines
from kplate.panel import Panel
from kplate.supports import Support


def version() -> str:
    """Version of the installed package."""
    from importlib import metadata  # which takes long to import

    return metadata.version("kplate")


def heading(panel: Panel) -> list[str]:
    """Identity, and the panel as it was understood."""
    plate, length = panel.plate, panel.units.length
    title = f"{panel.name}, {thickness_words(panel)} {plate.material.name}"
    if panel.revision:
        title += f", revision {panel.revision}"
    lines = [
        f"{title}   input {panel.digest}, kplate {version()}",
        describe(plate.outline, mass=plate.mass, unit=length),
    ]
    by_support: dict[Support, list[str]] = {}
    for name in plate.outline.names:
        by_support.setdefault(plate.support(name), []).append(name)
    lines += [
        f"{support.name} ({support.words}): {', '.join(names)}"
        for support, names in by_support.items()
    ]
    lines += [
        f"zone {name}: {short(h, panel.units.deflection.size)} "
        f"{panel.units.deflection.symbol} {material.name}"
        for name, (h, material) in zip(
            plate.outline.zone_names, plate.sections[1:], strict=True
        )
    ]
    others = {m.name for _, m in plate.sections} - {plate.material.name}
    if others and any(isinstance(own, StressLimit) for own in panel.limits):
        lines.append(
            f"the stress limit is that of {plate.material.name}; it is held against "
            f"zones of {', '.join(sorted(others))} alike"
        )
    lines += panel.notes
    bends = _bends(panel)
    if bends:
        degrees = np.degrees(plate.bend_turn)
        lines.append(
            f"bends, turning less than {degrees:.3g} degrees, taken with one tangent: "
            f"{', '.join(bends)} {length.symbol}"
        )
    return lines + stated_lines(panel)


def _bends(panel: Panel) -> list[str]:
    """Vertices between sides held alike that count as bends."""
    plate, size = panel.plate, panel.units.length.size
    places = []
    for line in plate.outline.boundaries:
        for i, (x, y) in enumerate(line.points):
            before, after = (
                plate.support(line.sides[i - 1]),
                plate.support(line.sides[i]),
            )
            if (
                before == after
                and before.holds_deflection
                and not line.straight[i]
                and abs(line.turns[i]) < plate.bend_turn
            ):
                places.append(place_words((float(x), float(y)), size))
    return places


def thickness_words(panel: Panel) -> str:
    """The plate's thickness with its unit."""
    unit = panel.units.deflection
    return f"{short(panel.plate.thickness, unit.size)} {unit.symbol}"
