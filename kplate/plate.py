"""The stated panel: outline, thickness, material and supports."""

import difflib
import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from functools import cached_property
from types import MappingProxyType
from typing import Any

import numpy as np

from kplate import chords
from kplate.arrays import Floats
from kplate.errors import InputError
from kplate.materials import Isotropic
from kplate.outline import Outline
from kplate.polygon import SNAP, Polygon, at
from kplate.supports import FREE, SUPPORTS, Support

# Between sides held alike, a smaller turn is a bend of a curve, not a corner (a simply
# supported square with mid-side vertices 0.1 mm out would otherwise lose a third of w).
# Round-off does not decide about a 36-gon, whose vertices are corners.
BEND_TURN = chords.ARC_TURN - 1e-9


@dataclass(frozen=True, kw_only=True)
class Section:
    """What a zone is made of, where it differs from the plate.

    Parameters
    ----------
    thickness : float, optional
        Thickness in m, about the same middle plane; the plate's if left out.
    material : Isotropic, optional
        Material; the plate's if left out.

    Raises
    ------
    InputError
        If the thickness is not a positive number.
    """

    thickness: float | None = None
    material: Isotropic | None = None

    def __post_init__(self) -> None:
        """Check the thickness."""
        h = self.thickness
        if h is not None and not (math.isfinite(h) and h > 0.0):
            raise InputError(
                f"the thickness of a zone is {h:g} m; it must be a positive number."
            )


@dataclass(frozen=True, eq=False, kw_only=True)
class Plate:
    """A thin flat plate as the engineer states it.

    Parameters
    ----------
    outline : Outline
        Its sides and holes.
    thickness : float
        Thickness h in m.
    material : Isotropic
        Its material.
    supports : mapping of str to Support
        How each side is held, hole rims included, and seams and marks; what is not
        named is free.
    zones : mapping of str to Section
        What zones of the outline are made of, where they differ.
    bend_turn : float
        Between sides held alike, a turn of less than this (rad) is a bend of a curve
        with one tangent, not a corner with two.

    Raises
    ------
    InputError
        If the thickness is not positive, a support names no side, seam or mark, a
        section names no zone, or a supported side is a run of chords that may stand for
        a curve.
    """

    outline: Outline
    thickness: float
    material: Isotropic
    supports: Mapping[str, Support] = field(default_factory=dict)
    zones: Mapping[str, Section] = field(default_factory=dict)
    bend_turn: float = BEND_TURN

    def __post_init__(self) -> None:
        """Check the statement."""
        if not (math.isfinite(self.thickness) and self.thickness > 0.0):
            raise InputError(
                f"the thickness is {self.thickness:g} m; it must be a positive number."
            )
        if not 0.0 <= self.bend_turn < math.pi / 2:
            raise InputError(
                f"bend_turn is {self.bend_turn:g} rad; it must be at least 0 and less "
                "than a right angle."
            )
        supports = dict(self.supports)
        for name, support in supports.items():
            self._check_support(name, support)
        object.__setattr__(self, "supports", MappingProxyType(supports))
        zones = dict(self.zones)
        for name, section in zones.items():
            if not isinstance(section, Section):
                raise InputError(
                    f"zone {name!r} is made of {section!r}; give a Section with its "
                    "thickness or material."
                )
            if name not in self.outline.zone_names:
                raise InputError(
                    f"unknown zone {name!r}; the zones are "
                    f"{', '.join(self.outline.zone_names) or 'none'}."
                )
        object.__setattr__(self, "zones", MappingProxyType(zones))
        self._check_points()
        self._check_overlaps()
        for line in self.outline.boundaries:
            self._check_chords(line)

    def __getstate__(self) -> dict[str, Any]:
        """State to copy or send to another process, which takes no read-only views."""
        plain = {"supports": dict(self.supports), "zones": dict(self.zones)}
        return {**self.__dict__, **plain}

    def __setstate__(self, state: dict[str, Any]) -> None:
        """Restore what `__getstate__` gave."""
        for key in ("supports", "zones"):
            state = {**state, key: MappingProxyType(state[key])}
        self.__dict__.update(state)

    def support(self, name: str) -> Support:
        """How a side, seam or mark is held."""
        return self.supports.get(name, FREE)

    @cached_property
    def sections(self) -> tuple[tuple[float, Isotropic], ...]:
        """Thickness and material of the plate around the zones, then of each zone."""
        found = [(self.thickness, self.material)]
        for name in self.outline.zone_names:
            own = self.zones.get(name, Section())
            found.append(
                (own.thickness or self.thickness, own.material or self.material)
            )
        return tuple(found)

    @cached_property
    def rigidities(self) -> Floats:
        """Moments per curvature of each section, (n_sections, 3, 3) in N m."""
        return np.stack([material.rigidity(h) for h, material in self.sections])

    @property
    def rigidity(self) -> Floats:
        """Moments per curvature of the plate around the zones, (3, 3) in N m."""
        return self.material.rigidity(self.thickness)

    @property
    def thicknesses(self) -> Floats:
        """Thickness of each section in m."""
        return np.array([h for h, _ in self.sections])

    @property
    def mass(self) -> float | None:
        """Mass in kg, or ``None`` where a material states no density."""
        areas = [self.outline.zone_area(name) for name in self.outline.zone_names]
        total = 0.0
        for (h, material), area in zip(
            self.sections, [self.outline.area - sum(areas), *areas], strict=True
        ):
            if material.density is None:
                return None
            total += material.density * h * area
        return total

    def _check_support(self, name: str, support: Support) -> None:
        names = self.outline.names
        if name not in names:
            close = difflib.get_close_matches(str(name), names, n=1)
            hint = f" Did you mean {close[0]!r}?" if close else ""
            raise InputError(
                f"unknown side {name!r}; the sides are {', '.join(sorted(names))}."
                f"{hint}"
            )
        if not isinstance(support, Support) or support not in SUPPORTS.values():
            raise InputError(
                f"side {name!r} is held by {support!r}; a support is one of "
                f"{', '.join(SUPPORTS)}."
            )

    def _check_points(self) -> None:
        """Refuse what a point cannot hold: a slope."""
        for mark in self.outline.marks:
            support = self.support(mark.name)
            if support.holds_slope:
                raise InputError(
                    f"mark {mark.name!r} is {support.name}; a point of a thin plate "
                    "can only be simply supported. Hold a slope along a seam or a side."
                )

    def _check_overlaps(self) -> None:
        """Refuse held seams that run along what is held already."""
        held = [seam for seam in self.outline.seams if self.support(seam.name).holds]
        least = SNAP * self.outline.size
        for number, seam in enumerate(held):
            paths = [(other.name, other.path) for other in held[:number]]
            for line in self.outline.boundaries if held else ():
                paths += [
                    (name, line.path(name))
                    for name in dict.fromkeys(line.sides)
                    if self.support(name).holds
                ]
            for name, path in paths:
                if path.buffer(least).intersection(seam.path).length > 1e3 * least:
                    raise InputError(
                        f"seam {seam.name!r} runs along {name!r}, which is held too; "
                        "hold one of them there."
                    )

    def _check_chords(self, line: Polygon) -> None:
        """Refuse chords that may stand for a curve where supports would clamp it."""
        held = [self.support(name) for name in line.sides]
        alike = [s if s.holds_deflection or s.holds_slope else None for s in held]
        # By supports, not names: pieces of a curve may have names of their own.
        words = tuple(support.name for support in held)
        for run in chords.runs(line.points, words, line.bulges, line.turns):
            ask = line.chords != "polygon" and abs(run.turn) >= BEND_TURN
            if ask and alike[run.first] is not None:
                raise InputError(_ask(line, run, words[run.first]))
        for i in _bend_runs(line, alike, self.bend_turn):
            raise InputError(
                f"side {line.sides[i]!r} is {held[i].name} and bends at three or more "
                f"vertices in a row from {at(line.points[i])}: a curve drawn by "
                "chords. State it by arcs, as an ellipse, or drop vertices until each "
                "turn is a corner."
            )


def _ask(line: Polygon, run: chords.Run, held: str) -> str:
    """Ask what chords on a circle are."""
    n = len(line.sides)
    names = {line.sides[(run.first + k) % n] for k in range(run.pieces)}
    first = "" if len(names) == 1 else "give them one name and "
    return (
        f"side {line.sides[run.first]!r} is {held} and has {run.pieces} pieces from "
        f"{at(line.points[run.first])} that turn by {math.degrees(abs(run.turn)):.3g} "
        f'degrees each on a circle; {first}say whether they are an "arc" or a '
        '"polygon" (chords).'
    )


def _bend_runs(line: Polygon, alike: Sequence[object], limit: float) -> Iterator[int]:
    """Vertices at which a run of three or more bends begins.

    Vertices on a straight piece that is held alike on both sides of them do not part a
    run: they are no vertices of the curve.

    Parameters
    ----------
    line : Polygon
        The closed line.
    alike : sequence, length n
        How each side is held; ``None`` where it is free.
    limit : float
        The turn in rad below which a vertex is a bend.

    Yields
    ------
    int
        Number of the first vertex of each run.
    """
    n = len(line.points)
    held = np.array(
        [alike[i] is not None and alike[i] == alike[i - 1] for i in range(n)]
    )
    kept = np.flatnonzero(~(held & line.straight))
    # Where a piece is an arc, a small turn is a tangent that was rounded.
    chord = (line.bulges == 0.0) & (np.roll(line.bulges, 1) == 0.0)
    bend = (held & chord & (np.abs(line.turns) < limit))[kept]
    m = len(kept)
    for i in range(m):
        first = not bend[i - 1] or (i == 0 and bend.all())
        if first and bend[[i, (i + 1) % m, (i + 2) % m]].all():
            yield int(kept[i])
