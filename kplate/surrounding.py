"""The rectangle around a plate, and how its sides would be held."""

import math
from dataclasses import dataclass

import numpy as np

from kplate.arrays import Floats
from kplate.mesh import Mesh
from kplate.plate import Plate

# Supports west, east, south, north of a rectangle in its own axes.
Ends = tuple[str, str, str, str]


@dataclass(frozen=True, eq=False)
class Frame:
    """A rectangle around a plate: its origin, axes (2, 2) and size."""

    origin: Floats
    axes: Floats
    size: tuple[float, float]

    def wider(self, share: float) -> "Frame":
        """The same, larger by a share of its size all round."""
        a, b = self.size
        origin = self.origin - share * np.array(self.size) @ self.axes
        return Frame(origin, self.axes, ((1 + 2 * share) * a, (1 + 2 * share) * b))

    def own(self, places: Floats) -> Floats:
        """Places in the rectangle's own axes."""
        local: Floats = (places - self.origin) @ self.axes.T
        return np.clip(local, 0.0, self.size)


def frame_around(plate: Plate) -> Frame:
    """The rectangle around a plate along its longest straight side."""
    line = plate.outline.boundaries[0]
    points = np.asarray(line.points, dtype=float)
    steps = np.roll(points, -1, axis=0) - points
    lengths = np.where(line.bulges == 0.0, np.hypot(*steps.T), 0.0)
    along = np.array([1.0, 0.0])
    if lengths.any():
        along = steps[lengths.argmax()] / lengths.max()
    # Of the four ways to turn it, that nearest the plate's own axes.
    turn = round(2.0 * math.atan2(along[1], along[0]) / math.pi)
    c, s = (1, 0, -1, 0)[turn % 4], (0, 1, 0, -1)[turn % 4]
    along = np.array([c * along[0] + s * along[1], c * along[1] - s * along[0]])
    axes = np.array([along, [-along[1], along[0]]])
    reach = np.array(plate.outline.region.exterior.coords) @ axes.T
    low, high = reach.min(axis=0), reach.max(axis=0)
    a, b = (high - low).tolist()
    return Frame(low @ axes, axes, (a, b))


def held_ends(plate: Plate, mesh: Mesh, frame: Frame, *, alike: bool) -> Ends | None:
    """Supports of the rectangle's sides, from the plate's that face the same way.

    `alike`: only where all that face one way are; else what most of the length is.
    """
    rim = np.isin(
        mesh.boundary_sides,
        [
            mesh.side_names.index(n)
            for n in plate.outline.rim.sides
            if n in mesh.side_names
        ],
    )
    edges, sides = mesh.boundary_edges[rim], mesh.boundary_sides[rim]
    step = mesh.points[edges[:, 1]] - mesh.points[edges[:, 0]]
    outward = np.column_stack([step[:, 1], -step[:, 0]]) @ frame.axes.T
    facing = np.stack(
        [-outward[:, 0], outward[:, 0], -outward[:, 1], outward[:, 1]]
    ).argmax(axis=0)
    lengths = np.hypot(*step.T)
    words = np.array([plate.support(name).name for name in mesh.side_names])[sides]
    ends = []
    for way in range(4):
        own = facing == way
        by_word = {w: lengths[own & (words == w)].sum() for w in np.unique(words[own])}
        if not by_word or (alike and len(by_word) > 1):
            return None
        ends.append(str(max(by_word, key=lambda w: by_word[w])))
    if "guided" in ends:
        return None
    return ends[0], ends[1], ends[2], ends[3]
