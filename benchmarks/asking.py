"""Numbers of a record as goals of kplate, and their bands from those of the goals.

A principal moment takes the eigenvalues over the box of three components; a moment at a
clamped side follows from m_nn alone. Where a kind of number has no goal, the reason is
kept.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

import kplate as kp
from benchmarks import cases

COMPONENTS = ("m_xx", "m_yy", "m_xy")
ON_A_LINE = 1e-9  # m from a side or a vertex; the plates are about 1 m wide


@dataclass(frozen=True, kw_only=True)
class Asked:
    """A number of a record as goals, or why it is none.

    Parameters
    ----------
    item : dict
        The number as the record states it.
    goals : tuple of Goal
        What it follows from; empty where there is a reason.
    share : float
        What it is of m_nn, where it lies on a clamped side; 0 elsewhere.
    reason : str
        Why there is no band.
    """

    item: dict[str, Any]
    goals: tuple[kp.Goal, ...] = ()
    share: float = 0.0
    reason: str = ""

    @property
    def words(self) -> str:
        """What, and where."""
        x, y = self.item["at"]
        return f"{self.item['quantity']} at ({x:.4g}, {y:.4g})"


def ask(plate: kp.Plate, problem: dict[str, Any], item: dict[str, Any]) -> Asked:
    """State a number as goals."""
    quantity, at = item["quantity"], tuple(item["at"])
    if quantity == "corner force":
        return Asked(item=item, reason="a corner force is no bounded functional")
    if quantity == "deflection":
        return Asked(item=item, goals=(kp.Deflection(at=at),))
    if quantity == "point reaction":
        names = [m["name"] for m in problem["marks"] if tuple(m["at"]) == at]
        return Asked(item=item, goals=(kp.Resultant(of=names[0]),))
    sides = _sides_at(plate, at)
    if len(sides) > 1:
        return Asked(item=item, reason="lies in a corner")
    if sides and sides[0].bent:
        return Asked(item=item, reason="lies on a round side")
    support = sides[0].support if sides else None
    if quantity == "line reaction":
        if support != kp.SIMPLY_SUPPORTED:
            where = f"on a {support.name} side" if support else "on a line support"
            return Asked(item=item, reason=f"lies {where}")
        return Asked(item=item, goals=(kp.LineReaction(at=at),))
    if support is not None and (support != kp.CLAMPED or quantity == "shear"):
        return Asked(item=item, reason=f"lies on a {support.name} side")
    if quantity == "shear":
        normal = tuple(item["normal"])
        return Asked(item=item, goals=(kp.Shear(at=at, direction=normal),))
    if support == kp.CLAMPED:
        share = _share_of_clamping(item, sides[0].normal, problem["nu"])
        return Asked(item=item, goals=(kp.ClampingMoment(at=at),), share=share)
    wanted = (quantity,) if quantity in COMPONENTS else COMPONENTS
    goals = tuple(kp.Moment(at=at, component=component) for component in wanted)
    return Asked(item=item, goals=goals)


def combined(asked: Asked, found: Sequence[kp.Value]) -> tuple[float, float, float]:
    """Value and ends of a number's band from those of its goals, scaled to D = 1."""
    ends = np.array([[v.value, v.lower, v.upper] for v in found], dtype=float).T
    scale = cases.STIFFNESS if asked.item["quantity"] == "deflection" else 1.0
    value, lower, upper = (scale * number for number in _combined(asked, ends))
    return value, lower, upper


@dataclass(frozen=True, kw_only=True)
class _Side:
    """What holds a place of the boundary: support, outward normal, whether bent."""

    support: kp.Support
    normal: tuple[float, float]
    bent: bool


def _sides_at(plate: kp.Plate, at: tuple[float, float]) -> list[_Side]:
    """Sides on which a place lies."""
    found = []
    for line in plate.outline.boundaries:
        pieces = zip(
            line.points, line.ends, line.sides, line.bulges, line.circles, strict=True
        )
        for start, end, name, bulge, circle in pieces:
            support = plate.support(name)
            if bulge:
                x, y, r = circle
                ray = np.subtract(at, (x, y))
                if abs(np.hypot(*ray) - r) < 1e-6 * r and not found:
                    normal = (float(ray[0] / r), float(ray[1] / r))
                    found.append(_Side(support=support, normal=normal, bent=True))
                continue
            length = float(np.hypot(*(end - start)))
            x, y = (end - start) / length
            along, across = np.array([[x, y], [y, -x]]) @ (np.asarray(at) - start)
            if abs(across) < ON_A_LINE and -ON_A_LINE < along < length + ON_A_LINE:
                normal = (float(y), float(-x))
                found.append(_Side(support=support, normal=normal, bent=False))
    return found


def _combined(asked: Asked, ends: np.ndarray) -> tuple[float, float, float]:
    """Value and ends of a number from those of its goals (3, k)."""
    quantity = asked.item["quantity"]
    if asked.share:
        value, *own = (asked.share * ends[:, 0]).tolist()
        return value, min(own), max(own)
    if quantity in ("m_1", "m_2"):
        sign = 1.0 if quantity == "m_1" else -1.0
        low, high = ends[1].copy(), ends[2].copy()
        # The larger moment grows with both bending moments and with |m_xy|, the
        # smaller falls with |m_xy|.
        size = np.abs([low[2], high[2]])
        least = 0.0 if low[2] < 0.0 < high[2] else float(size.min())
        twists = (least, float(size.max()))[:: int(sign)]
        low[2], high[2] = twists
        number = 0 if quantity == "m_1" else 1
        three = kp.principal_moments(np.array([ends[0], low, high]))[0][:, number]
        return float(three[0]), float(three[1]), float(three[2])
    weights = np.ones(len(ends[0]))
    if quantity == "moment":
        n_x, n_y = asked.item["normal"]
        weights = np.array([n_x * n_x, n_y * n_y, 2.0 * n_x * n_y])
    middle, half = 0.5 * (ends[1] + ends[2]), 0.5 * (ends[2] - ends[1])
    centre, reach = float(weights @ middle), float(np.abs(weights) @ half)
    return float(weights @ ends[0]), centre - reach, centre + reach


def _share_of_clamping(
    item: dict[str, Any], normal: tuple[float, float], nu: float
) -> float:
    """A moment at a clamped edge over m_nn there; along it m_tt is nu m_nn."""
    n = np.array(normal)
    tensor = np.outer(n, n) + nu * (np.eye(2) - np.outer(n, n))
    if item["quantity"] == "moment":
        given = np.array(item["normal"])
        return float(given @ tensor @ given)
    i, j = {"m_xx": (0, 0), "m_yy": (1, 1), "m_xy": (0, 1)}[item["quantity"]]
    return float(tensor[i, j])
