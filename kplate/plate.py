"""The stated panel: outline, thickness, material and supports."""

import difflib
import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import Any

import numpy as np

from kplate.arrays import Floats
from kplate.errors import InputError
from kplate.materials import Isotropic
from kplate.outline import BEND_TURN, Outline, Polygon
from kplate.supports import FREE, SUPPORTS, Support


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
        How each side is held, hole rims included; a side that is not named is free.
    bend_turn : float
        Between sides held alike, a turn of less than this (rad) is a bend of a curve
        with one tangent, not a corner with two.

    Raises
    ------
    InputError
        If the thickness is not positive, a support names no side, or a supported side
        is a run of chords (three or more bends in a row).
    """

    outline: Outline
    thickness: float
    material: Isotropic
    supports: Mapping[str, Support] = field(default_factory=dict)
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
        for line in self.outline.lines:
            if isinstance(line, Polygon):
                self._check_chords(line)

    def __getstate__(self) -> dict[str, Any]:
        """State to copy or send to another process, which takes no read-only views."""
        return {**self.__dict__, "supports": dict(self.supports)}

    def __setstate__(self, state: dict[str, Any]) -> None:
        """Restore what `__getstate__` gave."""
        supports = MappingProxyType(state["supports"])
        self.__dict__.update(state, supports=supports)

    def support(self, side: str) -> Support:
        """How a side is held."""
        return self.supports.get(side, FREE)

    @property
    def rigidity(self) -> Floats:
        """Moments per curvature, (3, 3) in N m."""
        return self.material.rigidity(self.thickness)

    @property
    def mass(self) -> float | None:
        """Mass in kg, or ``None`` where the material states no density."""
        if self.material.density is None:
            return None
        return self.material.density * self.thickness * self.outline.area

    def _check_support(self, name: str, support: Support) -> None:
        names = self.outline.side_names
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

    def _check_chords(self, line: Polygon) -> None:
        """Refuse a curve drawn by chords where its supports would clamp it."""
        held = [self.support(name) for name in line.sides]
        alike = [s if s.holds_deflection else None for s in held]
        for i in _bend_runs(line, alike, self.bend_turn):
            x, y = line.points[i]
            raise InputError(
                f"side {line.sides[i]!r} is {held[i].name} and "
                f"bends at three or more vertices in a row from ({x:.6g}, {y:.6g}) m: "
                "a curve drawn by chords. State a circle, or drop vertices until each "
                "turn is a corner."
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
    bend = (held & (np.abs(line.turns) < limit))[kept]
    m = len(kept)
    for i in range(m):
        first = not bend[i - 1] or (i == 0 and bend.all())
        if first and bend[[i, (i + 1) % m, (i + 2) % m]].all():
            yield int(kept[i])
