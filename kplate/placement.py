"""Whether holes, zones, seams and marks lie on the plate where they may.

Regions and paths are shapely's, chords for arcs; `least` is the length in m below which
a gap is none.
"""

from collections.abc import Sequence
from typing import Any

from kplate.errors import InputError
from kplate.polygon import Polygon, at


def check_hole(rim: Polygon, hole: Polygon, number: int, least: float) -> None:
    """Refuse a hole that is not strictly inside the rim."""
    import shapely

    gap = shapely.shortest_line(rim.region.exterior, hole.region.exterior)
    if rim.region.contains(hole.region) and gap.length > least:
        return
    touches = rim.region.buffer(least).contains(hole.region)
    how = "touches" if touches else "crosses or lies outside"
    raise InputError(
        f"hole {number} ({hole.sides[0]!r}) {how} the outline near {at(gap.coords[0])};"
        " a hole must lie strictly inside the plate. Move or shrink it, or cut the "
        "notch into the outline."
    )


def check_apart(holes: Sequence[Polygon], least: float) -> None:
    """Refuse holes that overlap or touch."""
    import shapely

    if len(holes) < 2:
        return
    regions = [hole.region for hole in holes]
    tree = shapely.STRtree(regions)
    pairs = tree.query(regions, predicate="dwithin", distance=least).T
    for i, j in pairs[pairs[:, 0] < pairs[:, 1]].tolist():
        gap = shapely.shortest_line(regions[i], regions[j])
        common = regions[i].intersection(regions[j])
        place = common.representative_point() if common.area > 0.0 else gap
        raise InputError(
            f"holes {i + 1} ({holes[i].sides[0]!r}) and {j + 1} "
            f"({holes[j].sides[0]!r}) overlap or touch near {at(place.coords[0])}; "
            "move them apart, or draw them as one hole."
        )


def check_zone(name: str, zone: Any, rim: Any, plate: Any) -> None:
    """Refuse a zone that is not within the rim (grown) or not on the plate."""
    if not rim.covers(zone):
        outside = zone.difference(rim).representative_point()
        raise InputError(
            f"zone {name!r} lies outside the outline near {at(outside.coords[0])}; "
            "draw it within."
        )
    if not plate.intersects(zone.representative_point()) and (
        plate.intersection(zone).area <= 1e-6 * zone.area
    ):
        raise InputError(f"zone {name!r} lies in a hole; move it.")


def check_zones_apart(names: tuple[str, str], a: Any, b: Any, least: float) -> None:
    """Refuse zones that share an area; edges they may."""
    common = a.intersection(b)
    if not common.buffer(-least).is_empty:
        place = common.buffer(-least).representative_point()
        raise InputError(
            f"zones {names[0]!r} and {names[1]!r} overlap near {at(place.coords[0])}; "
            "zones may share edges but not areas."
        )


def check_seam(name: str, path: Any, plate: Any) -> None:
    """Refuse a seam that crosses itself or leaves the plate (grown)."""
    if not path.is_simple:
        raise InputError(f"seam {name!r} crosses itself; draw it as two seams.")
    if not plate.covers(path):
        outside = path.difference(plate).interpolate(0.5, normalized=True)
        raise InputError(
            f"seam {name!r} leaves the plate near {at(outside.coords[0])}; end it on "
            "the boundary."
        )


def check_mark(name: str, place: tuple[float, float], plate: Any) -> None:
    """Refuse a mark that is not on the plate (grown)."""
    import shapely

    if not plate.covers(shapely.Point(place)):
        raise InputError(
            f"mark {name!r} at {at(place)} is not on the plate; it lies outside the "
            "outline or in a hole."
        )


def covers(region: Any, line: Any, slack: float) -> bool:
    """Whether a region (grown) covers the polygon of a line (k, 2)."""
    import shapely

    return bool(region.buffer(slack).covers(shapely.Polygon(line)))
