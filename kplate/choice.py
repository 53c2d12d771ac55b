"""Which element suits a plate.

The C1 quintic reaches a given error with the fewest unknowns by far, and follows round
edges, but it has one curvature at a vertex. So ``"auto"`` means

- ``quintic`` on plates of one section;
- ``hct`` where the thickness or material changes or a seam holds the slope (moments
  jump at both), or a held side bends (one tangent at a vertex leaves w not quite 0
  along the edges, which the quintic answers with false shears);
- ``dkt`` beyond `MOST` triangles.
"""

from dataclasses import dataclass

from kplate.elements import ELEMENTS
from kplate.errors import InputError
from kplate.plate import Plate

AUTO = "auto"
# Triangles beyond which the quintic and HCT would need more memory than most machines
# have: 450,000 and 600,000 unknowns.
MOST = 100_000
# About how many triangles to use where nobody says.
TRIANGLES = {"quintic": 3_000, "hct": 10_000, "dkt": 20_000}


@dataclass(frozen=True, kw_only=True)
class Choice:
    """An element, and why.

    Parameters
    ----------
    element : str
        Its name in the table of elements.
    reason : str
        Why it is not the quintic; empty where it is, or was asked for.
    """

    element: str
    reason: str = ""


def choose(plate: Plate, element: str = AUTO, triangles: int | None = None) -> Choice:
    """Choose the element for a plate.

    Parameters
    ----------
    plate : Plate
        The statement.
    element : str, optional
        ``"auto"``, or a name in the table of elements.
    triangles : int, optional
        About how many triangles are asked for.

    Returns
    -------
    Choice

    Raises
    ------
    InputError
        If there is no such element, or the quintic is asked for where it would give
        wrong moments.
    """
    if element != AUTO and element not in ELEMENTS:
        raise InputError(
            f"there is no element {element!r}; the elements are {', '.join(ELEMENTS)}, "
            f"or {AUTO!r} for the one that suits the plate."
        )
    kinks = _kinks(plate)
    if element == "quintic" and kinks:
        raise InputError(
            f"the quintic would give wrong moments: {kinks}; use element {AUTO!r}, "
            "'hct' or 'dkt'."
        )
    if element != AUTO:
        return Choice(element=element)
    if triangles is not None and triangles > MOST:
        return Choice(element="dkt", reason=f"more than {MOST} triangles are asked for")
    if kinks:
        return Choice(element="hct", reason=kinks)
    return Choice(element="quintic")


def _kinks(plate: Plate) -> str:
    """Words for what one curvature at a vertex does not suit."""
    for number, zone in enumerate(plate.outline.zones, start=1):
        if plate.sections[number] != plate.sections[0]:
            return f"thickness or material changes at zone {zone.name}"
    for seam in plate.outline.seams:
        if plate.support(seam.name).holds_slope:
            return f"seam {seam.name} holds the slope"
    for side in _bent_sides(plate):
        return f"side {side} bends where it is held"
    return ""


def _bent_sides(plate: Plate) -> list[str]:
    """Names of the sides at bends between sides held alike."""
    found = []
    for line in plate.outline.boundaries:
        for i, side in enumerate(line.sides):
            own, before = plate.support(side), plate.support(line.sides[i - 1])
            bend = not line.straight[i] and abs(line.turns[i]) < plate.bend_turn
            if bend and own.holds and own == before:
                found.append(side)
    return found
