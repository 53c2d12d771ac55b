"""Patches that roam over a plate, and the places where they may stand."""

import math
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from kplate.arrays import Floats
from kplate.errors import InputError
from kplate.goals import Place
from kplate.loads import DiscPatch, Load, RectanglePatch
from kplate.placement import covers
from kplate.plate import Plate

MOST = 20_000  # places

Patch = RectanglePatch | DiscPatch


@dataclass(frozen=True, kw_only=True)
class Roaming:
    """A patch that roams over a plate or one of its zones.

    Parameters
    ----------
    name : str
        How the case is called in tables.
    patch : RectanglePatch or DiscPatch
        Force, size and angle; its centre does not matter.
    step : float
        Distance in m between places, at most.
    zone : str, optional
        Where the whole of it stays; the plate if left out.
    loads : tuple of Load, optional
        What acts at the same time.

    Raises
    ------
    InputError
        If the step is not a positive number.
    """

    name: str
    patch: Patch
    step: float
    zone: str | None = None
    loads: tuple[Load, ...] = ()

    def __post_init__(self) -> None:
        """Check the step."""
        if not (math.isfinite(self.step) and self.step > 0.0):
            raise InputError(
                f"the step of {self.name!r} is {self.step:g} m; it must be positive."
            )

    def at(self, place: Place) -> Patch:
        """The patch at a place."""
        return replace(self.patch, centre=place)


def placements(plate: Plate, roaming: Roaming) -> Floats:
    """Centres (k, 2) in m at which the whole patch lies where it may.

    Raises
    ------
    InputError
        If there are none, or too many.
    """
    region = _region(plate, roaming.zone)
    patch = roaming.at((0.0, 0.0))
    if isinstance(patch, RectanglePatch):
        reach = np.abs(patch.corners).max(axis=0)
    else:
        reach = np.array([patch.radius, patch.radius])
    low_x, low_y, high_x, high_y = region.bounds
    where = f"zone {roaming.zone!r}" if roaming.zone else "the plate"
    axes = []
    for low, high, own in ((low_x, high_x, reach[0]), (low_y, high_y, reach[1])):
        room = high - low - 2.0 * own
        if room < -1e-9 * (high - low):
            raise InputError(
                f"the patch of {roaming.name!r} does not fit on {where}; shrink it."
            )
        count = math.ceil(max(room, 0.0) / roaming.step - 1e-9) + 1
        axes.append((low + own, max(room, 0.0), count))
    total = axes[0][2] * axes[1][2]
    if total > MOST:
        raise InputError(
            f"the step of {roaming.name!r} makes {total} places; choose one that makes "
            f"{MOST} at most."
        )
    (x0, dx, nx), (y0, dy, ny) = axes
    x = x0 + dx * (np.linspace(0.0, 1.0, nx) if nx > 1 else np.array([0.5]))
    y = y0 + dy * (np.linspace(0.0, 1.0, ny) if ny > 1 else np.array([0.5]))
    X, Y = np.meshgrid(x, y, indexing="ij")
    places = np.column_stack([X.ravel(), Y.ravel()])
    places = places[[fits(plate, roaming, (px, py)) for px, py in places.tolist()]]
    if not len(places):
        raise InputError(
            f"the patch of {roaming.name!r} fits on {where} at no place of its "
            "lattice; shrink the patch or the step."
        )
    return places


def fits(plate: Plate, roaming: Roaming, place: Place) -> bool:
    """Whether the whole patch lies where it may."""
    patch = roaming.at(place)
    line: Any
    if isinstance(patch, RectanglePatch):
        line = patch.corners
    else:
        # A polygon around the disc, so that chords take nothing off.
        turns = 2.0 * np.pi * np.arange(48) / 48
        r = patch.radius
        line = np.array(place) + r * np.column_stack([np.cos(turns), np.sin(turns)])
    return covers(_region(plate, roaming.zone), line, slack=1e-7 * plate.outline.size)


def _region(plate: Plate, zone: str | None) -> Any:
    """Where a patch may be, as a shapely polygon."""
    outline = plate.outline
    if zone is None:
        return outline.region
    for own in outline.zones:
        if own.name == zone:
            return own.shape.line.region.intersection(outline.region)
    names = ", ".join(own.name for own in outline.zones) or "none"
    raise InputError(f"there is no zone {zone!r} to roam on; the zones are {names}.")
