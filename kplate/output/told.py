"""What the record of a result tells beside its fields: statement, reactions, places.

`told` takes the plain data of `kplate.output.record.solution_record`, fresh or read
back from a .json file, and keeps what pictures draw. Everything is in SI units,
positive up.
"""

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from kplate import curves
from kplate.arrays import Floats
from kplate.supports import FREE, SUPPORTS, Support

STEP = np.radians(2.0)  # from chord to chord of an arc
Place = tuple[float, float]


@dataclass(frozen=True, kw_only=True)
class LeftOut:
    """A disc without a finite moment; `case` is ``None`` where it holds for all."""

    place: Place
    radius: float
    reason: str
    case: str | None


@dataclass(frozen=True, eq=False, kw_only=True)
class Fence:
    """Line reaction along a side or seam.

    Parameters
    ----------
    side : str
        Its name.
    stretches : tuple of (ndarray (k, 2), ndarray (k,))
        Places in m, one after the other, and the reaction in N/m there, ``nan`` where
        it has no finite value.
    """

    side: str
    stretches: tuple[tuple[Floats, Floats], ...]


@dataclass(frozen=True, kw_only=True)
class SupportForce:
    """The force in N of a corner or a held mark; ``None`` where it is not finite."""

    name: str
    place: Place
    force: float | None


@dataclass(frozen=True, eq=False, kw_only=True)
class Told:
    """What is known of a result beside its fields; nothing without a record.

    Parameters
    ----------
    title : str
        Name of the panel.
    side_names, zone_names : tuple of str
        Names by number; the zones from number 1 on.
    supports : mapping of str to Support
        By the name of a side, seam or mark.
    seams, marks : mapping
        Lines (k, 2) and places in m by name.
    left_out : tuple of LeftOut
        Places without a finite moment.
    loads : mapping of str to list of dict
        Loads of each case as the record has them.
    fences, forces : mapping
        Line reactions, and forces of corners and marks, of each case.
    asked : tuple of dict
        Numbers that bands were asked for, as the record has them.
    """

    title: str = ""
    side_names: tuple[str, ...] = ()
    zone_names: tuple[str, ...] = ()
    supports: Mapping[str, Support] = field(default_factory=dict)
    seams: Mapping[str, Floats] = field(default_factory=dict)
    marks: Mapping[str, Place] = field(default_factory=dict)
    left_out: tuple[LeftOut, ...] = ()
    loads: Mapping[str, list[dict[str, Any]]] = field(default_factory=dict)
    fences: Mapping[str, tuple[Fence, ...]] = field(default_factory=dict)
    forces: Mapping[str, tuple[SupportForce, ...]] = field(default_factory=dict)
    asked: tuple[dict[str, Any], ...] = ()


def told(record: Mapping[str, Any]) -> Told:
    """Take a record apart.

    Raises
    ------
    LookupError, TypeError, ValueError, AttributeError
        If it is no record.
    """
    statement = record["statement"]
    outline = statement["outline"]
    return Told(
        title=str(record.get("panel", {}).get("name", "")),
        side_names=tuple(str(name) for name in record["side_names"]),
        zone_names=tuple(str(zone["name"]) for zone in outline["zones"]),
        supports={
            str(name): SUPPORTS.get(support["name"], FREE)
            for name, support in statement["supports"].items()
        },
        seams={str(seam["name"]): _line(seam) for seam in outline["seams"]},
        marks={str(mark["name"]): _place(mark["at [m]"]) for mark in outline["marks"]},
        left_out=tuple(
            LeftOut(
                place=_place(disc["place [m]"]),
                radius=float(disc["radius [m]"]),
                reason=str(disc["reason"]),
                case=disc["case"],
            )
            for disc in record["excluded"]
        ),
        loads={str(case["name"]): list(case["loads"]) for case in statement["cases"]},
        fences={
            str(found["case"]): tuple(map(_fence, found["reactions"]["sides"]))
            for found in record["results"]
        },
        forces={
            str(found["case"]): tuple(_forces(found["reactions"]))
            for found in record["results"]
        },
        asked=tuple(record["asked"]),
    )


def _place(pair: Any) -> Place:
    x, y = pair
    return float(x), float(y)


def _line(seam: Mapping[str, Any]) -> Floats:
    """A seam, its arcs as chords."""
    points = np.array(seam["points [m]"], dtype=np.float64)
    bulges = np.array(seam.get("bulges", np.zeros(len(points) - 1)), dtype=np.float64)
    flat, _ = curves.flattened(points[:-1], points[1:], bulges, step=STEP)
    return np.vstack([flat, points[-1:]])


def _fence(side: Mapping[str, Any]) -> Fence:
    """A side's stations, parted where they do not run on."""
    places = np.array(side["stations [m]"], dtype=np.float64).reshape(-1, 2)
    distance = np.array(side["distance [m]"], dtype=np.float64)
    values = np.array(side["line reaction [N/m]"], dtype=np.float64)
    step = np.hypot(*np.diff(places, axis=0).T)
    # Straight on, a step is as long as the distance grows; on an arc a little shorter.
    breaks = np.flatnonzero(step > 1.01 * np.diff(distance) + 1e-9) + 1
    return Fence(
        side=str(side["side"]),
        stretches=tuple(
            zip(np.split(places, breaks), np.split(values, breaks), strict=True)
        ),
    )


def _forces(reactions: Mapping[str, Any]) -> list[SupportForce]:
    """Forces of corners and held marks."""
    corners = [
        SupportForce(
            name=" / ".join(corner["sides"]),
            place=_place(corner["force [N]"]["place [m]"]),
            force=corner["force [N]"]["value"],
        )
        for corner in reactions["corners"]
    ]
    marks = [
        SupportForce(
            name=str(point["mark"]),
            place=_place(point["place [m]"]),
            force=point["force [N]"],
        )
        for point in reactions["points"]
    ]
    return corners + marks
