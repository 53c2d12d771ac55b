"""Signs on a plate in space: supports, loads, reactions, principal moments.

Supports stand at the undeflected plate: hatches where a side is clamped, dashes where
it is simply supported, dots where it is guided, a tripod under a held mark. Loads hang
on the plate: arrows with the figure for forces, short arrows for a pressure. A line
reaction is a fence along its side, above it where the support pushes up, below where it
holds down; forces of corners and marks are arrows with figures. Lengths are shares of
the plate's mean size.
"""

from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property
from itertools import pairwise
from typing import Any

import numpy as np

from kplate.arrays import Floats, Ints
from kplate.output.result import Result
from kplate.output.strokes import (
    FIXED,
    Label,
    Strokes,
    arrows,
    chains,
    dashes,
    hatches,
    joined,
    outline,
    spread,
)
from kplate.recovery import principal_moments
from kplate.supports import FREE

HATCH, REACH, BESIDE = 0.02, 0.022, 0.012
ARROW, SHORT, FENCE, STAND = 0.16, 0.07, 0.16, 0.03
GRID, CROSSES = 6, 18  # arrows of a pressure, crosses, over the mean size
LIFT = 0.004  # of crosses over the surface
# A fence is as high as said above where the reaction is what it stays below at 95 % of
# the stations; beside places without a finite one it is cut off at so many times that.
USUAL, CUT = 95.0, 1.8


@dataclass(frozen=True, eq=False, kw_only=True)
class Sign:
    """Strokes of one kind, with their labels."""

    strokes: Strokes = field(default_factory=Strokes)
    labels: tuple[Label, ...] = ()


class Signs:
    """Makes the signs of a result.

    Parameters
    ----------
    result : Result
        What is drawn.
    """

    def __init__(self, result: Result) -> None:
        self.result = result
        self.size = result.size
        self.points = result.fields.points[:, :2]

    @cached_property
    def _tree(self) -> Any:
        from scipy.spatial import cKDTree

        return cKDTree(self.points)

    @cached_property
    def sides(self) -> dict[str, list[Floats]]:
        """Chains of each side, with the plate to their left."""
        fields = self.result.fields
        numbers = fields.cell_data.get("side", (None, np.empty(0)))[1]
        if len(numbers) != len(fields.lines):
            return {}
        return {
            name: chains(self.points, fields.lines[numbers == number])
            for number, name in enumerate(self.result.told.side_names)
        }

    def nearest(self, places: Floats) -> Ints:
        """Point of the plate nearest to each place (k, 2)."""
        return np.asarray(self._tree.query(places)[1], dtype=np.int64)

    def names(self) -> list[Label]:
        """Names of sides, seams and marks, each in its middle."""
        told = self.result.told
        found = []
        for name, own in {
            **self.sides,
            **{n: [p] for n, p in told.seams.items()},
        }.items():
            if own:
                longest = max(own, key=lambda c: np.hypot(*np.diff(c, axis=0).T).sum())
                places, away = spread(longest, np.inf)
                at = places[0] + 2.0 * REACH * self.size * away[0]
                held = told.supports.get(name, FREE)
                words = f"{name}: {held.name}" if held.holds else name
                found.append(_label(words, at))
        for name, place in told.marks.items():
            found.append(_label(name, place, z=-STAND * self.size))
        return found

    def supports(self) -> Sign:
        """How sides, seams and marks are held."""
        told, size = self.result.told, self.size
        lines = dict(self.sides)
        for name, line in told.seams.items():
            lines[name] = [line, line[::-1]]
        parts = []
        for name, own in lines.items():
            held = told.supports.get(name, FREE)
            for chain in own:
                if held.holds_deflection and held.holds_slope:
                    parts.append(hatches(chain, HATCH * size, REACH * size))
                elif held.holds_deflection:
                    parts.append(dashes(chain, HATCH * size, 0.6, BESIDE * size))
                elif held.holds_slope:
                    parts.append(dashes(chain, 0.5 * HATCH * size, 0.25, BESIDE * size))
        marks = [p for n, p in told.marks.items() if told.supports.get(n, FREE).holds]
        for x, y in marks:
            reach = STAND * size
            angle = np.radians([90.0, 210.0, 330.0])
            feet = np.column_stack(
                [
                    x + 0.6 * reach * np.cos(angle),
                    y + 0.6 * reach * np.sin(angle),
                    np.full(3, -reach),
                ]
            )
            top = np.tile([x, y, 0.0], (3, 1))
            parts.append(Strokes.of(np.stack([top, feet], axis=1)))
        return Sign(strokes=joined(parts))

    def loads(self, case: str) -> Sign:
        """Loads of a case, as far as they have a place."""
        parts: list[Strokes] = []
        labels: list[Label] = []
        for load in self.result.told.loads.get(case, []):
            found = self._load(load)
            parts.append(found.strokes)
            labels += found.labels
        return Sign(strokes=joined(parts), labels=tuple(labels))

    def reactions(self, case: str, *, flat: bool = False) -> tuple[Sign, Sign]:
        """What pushes up, and what holds down, in a case.

        Where the plate is seen from above (`flat`), fences lie beside their sides: to
        the right of the way the stations run, which is outside, where they push up.
        """
        told, size, units = self.result.told, self.size, self.result.units
        fences, forces = told.fences.get(case, ()), told.forces.get(case, ())
        values = [v for fence in fences for _, v in fence.stretches]
        usual = _usual(values)
        parts: tuple[list[Strokes], list[Strokes]] = ([], [])
        labels: list[Label] = []
        for fence in fences:
            top = (0.0, np.zeros(2))
            for places, own in fence.stretches:
                height = FENCE * size * np.clip(own / (usual or 1.0), -CUT, CUT)
                for part, keep in zip(
                    parts, (height >= 0.0, height < 0.0), strict=True
                ):
                    part.append(_fence(places, height, keep, flat))
                if np.isfinite(own).any():
                    k = int(np.nanargmax(np.abs(own)))
                    top = max(top, (own[k], places[k]), key=lambda t: abs(t[0]))
            if abs(top[0]) > 1e-3 * usual:
                z = FENCE * size * np.clip(top[0] / usual, -CUT, CUT)
                figure = _signed(units.line_force.show(top[0], 3), top[0])
                words = f"{fence.side} {figure}"
                labels.append(_label(words, top[1], z=0.0 if flat else z))
        known = [own.force for own in forces if own.force is not None]
        largest = max(map(abs, known), default=0.0)
        for one in forces:
            if one.force is None:
                labels.append(_label("force without a finite value", one.place))
            elif abs(one.force) > 1e-6 * largest:
                # It comes from below and ends at the plate, or starts there, downwards.
                length = np.sign(one.force) * ARROW * size
                z = 0.0 if length > 0.0 else length
                tip = np.array([[*one.place, z]])
                if not flat:
                    sign = arrows(tip, np.array([length]))
                    parts[int(one.force < 0.0)].append(sign)
                figure = _signed(units.force.show(one.force), one.force)
                z = 0.0 if flat else -abs(length)
                labels.append(_label(figure, one.place, z=z))
        up, down = (Sign(strokes=joined(part)) for part in parts)
        return Sign(strokes=up.strokes, labels=tuple(labels)), down

    def crosses(self, case: str) -> tuple[Strokes, Strokes]:
        """Principal moments on a grid: those that are positive, those negative."""
        moments = self.result.values(case, "moments [N]")
        at = self._grid(self.size / CROSSES, self.result.judged(case))
        values, angle = principal_moments(moments[at])
        if not len(at) or not values.any():
            return Strokes(), Strokes()
        most = float(np.abs(values).max())
        half = 0.48 * self.size / CROSSES * np.abs(values) / most
        ends, kinds = [], []
        for k, turn in enumerate((0.0, 0.5 * np.pi)):
            way = np.column_stack([np.cos(angle + turn), np.sin(angle + turn)])
            arm = half[:, k, None] * way
            pair = np.stack([self.points[at] - arm, self.points[at] + arm], axis=1)
            z = np.full((*pair.shape[:2], 1), LIFT * self.size)
            ends.append(np.concatenate([pair, z], axis=-1))
            kinds.append(values[:, k] >= 0.0)
        both, positive = np.concatenate(ends), np.concatenate(kinds)
        own = np.tile(at, 2)[:, None]
        return (
            Strokes.of(both[positive], own[positive]),
            Strokes.of(both[~positive], own[~positive]),
        )

    def _grid(self, pitch: float, kept: Any) -> Ints:
        """Points of the plate that lie nearest to the nodes of a square grid."""
        low, high = self.points.min(axis=0), self.points.max(axis=0)
        axes = [
            np.arange(a + 0.5 * pitch, b, pitch) for a, b in zip(low, high, strict=True)
        ]
        nodes = np.stack(np.meshgrid(*axes), axis=-1).reshape(-1, 2)
        distance, at = self._tree.query(nodes)
        at = np.unique(at[distance < 0.5 * pitch])
        return at[kept[at]]

    def _load(self, load: Mapping[str, Any]) -> Sign:
        """One load."""
        kind, units = load["kind"], self.result.units
        if kind in ("rectangle patch", "disc patch", "point force"):
            force = load["force [N]"]
            place = np.array(load.get("centre [m]", load.get("at [m]")))
            anchor = int(self.nearest(place[None])[0])
            length = np.sign(force) * ARROW * self.size
            tip = np.array([[*place, 0.0]])
            sign = arrows(tip, np.array([length]), np.array([anchor]))
            rim = _patch(load)
            parts = [sign]
            if len(rim):
                line = outline(rim, self.nearest(rim))
                line.ends[..., 2] = LIFT * self.size
                parts.append(line)
            words = f"{units.force.show(abs(force))} {_way(force)}"
            label = Label(text=words, place=(*place.tolist(), -length), anchor=anchor)
            return Sign(strokes=joined(parts), labels=(label,))
        if kind == "line force":
            force = load["force [N/m]"]
            words = f"{units.line_force.show(abs(force), 3)} {_way(force)}"
            return self._along(load["along"], force, words)
        if kind == "edge moment":
            words = f"moment {units.moment.show(load['moment [N]'], 3)}"
            return self._along(load["along"], 0.0, words)
        if kind == "point moment":
            x, y = load["moment [N m]"]
            place = np.array(load["at [m]"])
            anchor = int(self.nearest(place[None])[0])
            label = Label(
                text=f"couple ({x:g}, {y:g}) N m",
                place=(*place.tolist(), 0.0),
                anchor=anchor,
            )
            return Sign(labels=(label,))
        return self._pressure(load)

    def _along(self, name: str, force: float, words: str) -> Sign:
        """Arrows along a side or a seam, none for no force."""
        seam = self.result.told.seams.get(name)
        own = self.sides.get(name, []) if seam is None else [seam]
        if not own:
            return Sign()
        places = np.concatenate([spread(c, self.size / GRID / 2.0)[0] for c in own])
        at = self.nearest(places)
        lengths = np.full(len(places), np.sign(force) * SHORT * self.size)
        tips = np.column_stack([places, np.zeros(len(places))])
        middle = len(places) // 2
        x, y = places[middle]
        label = Label(
            text=words, place=(x, y, -1.2 * lengths[middle]), anchor=int(at[middle])
        )
        strokes = arrows(tips, lengths, at) if force else Strokes()
        return Sign(strokes=strokes, labels=(label,))

    def _pressure(self, load: Mapping[str, Any]) -> Sign:
        """Short arrows on a grid; none where the pressure is not a plain number."""
        told = self.result.told
        kept = np.ones(len(self.points), dtype=bool)
        if load["kind"] == "pressure":
            if load["zone"] is not None:
                kept[:] = False
                zones = self.result.fields.cell_data["zone"][0]
                number = told.zone_names.index(load["zone"]) + 1
                kept[self.result.fields.triangles[zones == number]] = True
            pressure = np.full(len(self.points), load["value [Pa]"])
        elif load["kind"] == "hydrostatic pressure":
            up = np.array(load["up"])
            depth = load["level [m]"] - self.points @ (up / np.hypot(*up))
            pressure = load["specific_weight [N/m3]"] * np.maximum(depth, 0.0)
        else:
            return Sign()
        most = float(np.abs(pressure[kept]).max(initial=0.0))
        if most == 0.0:
            return Sign()
        pitch = self.size / GRID
        at = self._grid(pitch, kept)
        if not len(at):
            at = np.flatnonzero(kept)[:1]
        lengths = SHORT * self.size * pressure[at] / most
        at, lengths = at[lengths != 0.0], lengths[lengths != 0.0]
        tips = np.column_stack([self.points[at], np.zeros(len(at))])
        return Sign(strokes=arrows(tips, lengths, at))


def _usual(values: list[Floats]) -> float:
    """Line reaction that most stations stay below; 0 where there is none."""
    every = np.abs(np.concatenate([*values, np.empty(0)]))
    every = every[np.isfinite(every)]
    return float(np.percentile(every, USUAL)) if every.size else 0.0


def words_of(load: Mapping[str, Any], result: Result) -> str:
    """A load in words for a heading."""
    units, kind = result.units, load["kind"]
    match kind:
        case "pressure":
            value = load["value [Pa]"]
            where = f" on {load['zone']}" if load["zone"] else ""
            return f"{units.pressure.show(abs(value), 3)} {_way(value)}{where}"
        case "rectangle patch" | "disc patch" | "point force":
            force = load["force [N]"]
            where = "at a point" if kind == "point force" else "on a patch"
            return f"{units.force.show(abs(force))} {_way(force)} {where}"
        case "line force":
            force = load["force [N/m]"]
            shown = units.line_force.show(abs(force), 3)
            return f"{shown} {_way(force)} along {load['along']}"
        case "edge moment":
            moment = units.moment.show(load["moment [N]"], 3)
            return f"moment {moment} along {load['along']}"
        case "self-weight":
            return f"self-weight {_way(load['acceleration [m/s2]'])}"
    return str(kind)


def _way(value: float) -> str:
    return "up" if value > 0.0 else "down"


def _signed(text: str, value: float) -> str:
    return f"+{text}" if value > 0.0 else text


def _label(text: str, place: Any, z: float = 0.0) -> Label:
    x, y = place
    return Label(text=text, place=(float(x), float(y), float(z)), anchor=FIXED)


def _fence(places: Floats, height: Floats, keep: Any, flat: bool) -> Strokes:
    """Pales at some stations, and the rail over neighbours among them."""
    foot = np.column_stack([places, np.zeros(len(places))])
    up = np.tile([0.0, 0.0, 1.0], (len(places), 1))
    if flat:
        if len(places) < 2:
            return Strokes()
        along = np.gradient(places, axis=0)
        along /= np.hypot(*along.T)[:, None]
        up = np.column_stack([along[:, 1], -along[:, 0], np.zeros(len(places))])
    top = foot + height[:, None] * up
    rails = keep[:-1] & keep[1:]
    ends = [
        np.stack([foot[keep], top[keep]], axis=1),
        np.stack([top[:-1][rails], top[1:][rails]], axis=1),
    ]
    return Strokes.of(np.concatenate(ends))


def _patch(load: Mapping[str, Any]) -> Floats:
    """The rim of a patch as a chain; nothing for a point."""
    if load["kind"] == "disc patch":
        angle = np.linspace(0.0, 2.0 * np.pi, 49)
        around = np.column_stack([np.cos(angle), np.sin(angle)])
        return np.array(load["centre [m]"]) + load["radius [m]"] * around
    if load["kind"] == "rectangle patch":
        angle = load["angle [rad]"]
        c, s = np.cos(angle), np.sin(angle)
        corners = np.array([(-1, -1), (1, -1), (1, 1), (-1, 1), (-1, -1)]) / 2.0
        shares = np.linspace(0.0, 1.0, 12, endpoint=False)[:, None]
        edges = [a + shares * (b - a) for a, b in pairwise(corners)]
        flat = np.vstack([*edges, corners[:1]]) * np.array(load["size [m]"])
        return np.array(load["centre [m]"]) + flat @ np.array([[c, s], [-s, c]])
    return np.empty((0, 2))
