"""An independent check beside each case: what formulas say, without mesh or elements.

- *same*: the plate is a rectangle or a disc that `kplate.handbook` knows. The two
  deflections must agree.
- *upper*, *lower*: proven bounds on the work of the loads, of which the mean deflection
  under them is a share.
- *compares*: the rectangle around the plate, each of its sides held as most of the
  plate's sides that face the same way are. It proves nothing.

Why the bounds hold. The work f.w is the largest 2 f.v - a(v, v) of all v that the
supports allow, a being twice the bending energy; more freedom or less stiffness makes
it larger. A v that is 0 with its slope at the rim of a disc inside and beyond it is
allowed by any supports, if the disc meets no hole and no support inside: the clamped
disc is a lower bound, whatever holds the plate. Where the plate is clamped all round,
holes too, its every v is allowed by the clamped rectangle around it: an upper bound.
Where it is a convex polygon without free holes, held all round, and all loads act one
way, its work is no more than if all its sides were simply supported; then -D lap w and
w are deflections of membranes, which grow everywhere with the outline, up to those of
the simply supported rectangle around it. Zones count with the least (upper) or most
(lower) share that their rigidity is of the plate's, in any bending. Round rims lie
within a rectangle that is larger by `MARGIN`.
"""

import math
from dataclasses import dataclass, replace
from typing import Literal

import numpy as np

from kplate.arrays import Floats
from kplate.functionals import settled_vertices
from kplate.handbook import Shaped, clamped_disc_work, disc_centre, rectangle
from kplate.loads import Pressure, SelfWeight
from kplate.plate import Plate
from kplate.pointforces import forces_at_places
from kplate.polygon import SNAP
from kplate.shapes import Circle
from kplate.solution import Solution
from kplate.surrounding import Ends, Frame, frame_around, held_ends
from kplate.units import Unit

Relation = Literal["same", "upper", "lower", "compares"]
# What a plate of the same kind may differ by, and a bound be missed by, as a share.
AGREES, SLIP = 0.02, 0.005
DISCS = 200  # places tried for the disc inside
WEAK = 10.0  # a lower bound exceeded by this factor says nothing and is left out
MARGIN = 1e-3  # for what chords of arcs miss
ROUND_OFF = 1e-9


@dataclass(frozen=True, kw_only=True)
class Independent:
    """One formula beside one case.

    Parameters
    ----------
    case : str
        The load case.
    relation : {"same", "upper", "lower", "compares"}
        What the formula is to the plate.
    shape : str
        What it is of: "rectangle" or "disc".
    size : tuple of float
        Its sides, or its radius, in m.
    supports : tuple of str
        How its sides are held, south, east, north, west of its own; one word if alike.
    formula : str
        Whose.
    quantity : {"deflection", "mean deflection", "work"}
        The deflection at the place where the plate's peaks, the mean one under the
        loads (both in m), or the work of the loads (J) where these act both ways.
    found, value : float
        Magnitudes of what kplate found and of what the formula says, in m or J.
    left_out : str
        What of the plate a comparison leaves out.
    """

    case: str
    relation: Relation
    shape: str
    size: tuple[float, ...]
    supports: tuple[str, ...]
    formula: str
    quantity: str
    found: float
    value: float
    left_out: str = ""

    @property
    def ratio(self) -> float:
        """What was found as a share of what the formula says."""
        return self.found / self.value if self.value else math.nan

    @property
    def agrees(self) -> bool:
        """Whether what was found is as the formula demands."""
        match self.relation:
            case "same":
                return abs(self.ratio - 1.0) <= AGREES
            case "upper":
                return self.ratio <= 1.0 + SLIP
            case "lower":
                return self.ratio >= 1.0 - SLIP
        return True

    def words(self, length: Unit, deflection: Unit) -> str:
        """The check in one line, in these units."""
        sizes = " x ".join(f"{own / length.size:.4g}" for own in self.size)
        unit = length.symbol
        what = f"rectangle {sizes} {unit}"
        if self.shape == "disc":
            what = f"disc of radius {sizes} {unit}"
        held = ", ".join(self.supports)
        name = f"{held} {what}" if len(self.supports) == 1 else f"{what} ({held})"
        shown = f"{self.value:.4g} J"
        if self.quantity != "work":
            shown = deflection.show(self.value)
        quantity = {
            "deflection": "deflection there",
            "mean deflection": "mean deflection under the loads",
            "work": "work of the loads",
        }[self.quantity]
        how = {
            "same": f"{name}, the same plate, {self.formula}: {quantity} {shown}",
            "upper": f"{quantity} at most {shown}: {name} around it, {self.formula}",
            "lower": f"{quantity} at least {shown}: {name} inside it, {self.formula}",
            "compares": f"compares: {name} around it{self.left_out}, {self.formula}: "
            f"{quantity} {shown}",
        }[self.relation]
        ratio = f"{self.ratio:#.4g}".rstrip(".")
        warning = "" if self.agrees else " DOES NOT AGREE: find out why before use"
        return f"{how}, ratio {ratio}{warning}"


def independent(solution: Solution, *, case: str) -> tuple[Independent, ...]:
    """Check a case of a solution by formulas.

    Parameters
    ----------
    solution : Solution
        What was found.
    case : str
        The load case.

    Returns
    -------
    tuple of Independent
        Empty where no formula is near, such as for loads that are moments.
    """
    loads = solution.state.cases[solution.cases.index(case)].loads
    acting = forces_at_places(solution.plate, solution.mesh, loads)
    if acting is None or not np.abs(acting[1]).any():
        return ()
    places, forces = acting
    one_way = bool((forces >= 0.0).all() or (forces <= 0.0).all())
    judge = _Judge(solution, case, places, forces, one_way)
    same = judge.same()
    if same is not None:
        return (same,)
    lower = judge.lower()
    if lower is not None and lower.agrees and lower.ratio > WEAK:
        lower = None
    found = [judge.upper(), lower, judge.compares()]
    return tuple(own for own in found if own is not None)


@dataclass(frozen=True, eq=False)
class _Judge:
    """One case of a solution, and the forces that act in it."""

    solution: Solution
    case: str
    places: Floats
    forces: Floats
    one_way: bool

    def same(self) -> Independent | None:
        """The plate itself, where a formula knows it."""
        plate = self.solution.plate
        alone = not (plate.outline.holes or _held_inside(plate))
        if not alone or len(set(plate.sections)) > 1:
            return None
        if isinstance(plate.outline.rim, Circle):
            return self._disc()
        frame = frame_around(plate)
        a, b = frame.size
        if abs(plate.outline.area - a * b) > ROUND_OFF * a * b:
            return None
        ends = held_ends(plate, self.solution.mesh, frame, alike=True)
        return None if ends is None else self._at_peak("same", frame, ends)

    def compares(self) -> Independent | None:
        """The rectangle around the plate."""
        plate = self.solution.plate
        frame = frame_around(plate)
        ends = held_ends(plate, self.solution.mesh, frame, alike=False)
        found = None if ends is None else self._at_peak("compares", frame, ends)
        if found is None:
            return None
        missed = ["holes"] * bool(plate.outline.holes)
        missed += ["supports inside"] * bool(_held_inside(plate))
        missed += ["zones"] * (len(set(plate.sections)) > 1)
        words = f" without its {', '.join(missed)}" if missed else ""
        return replace(found, left_out=words)

    def upper(self) -> Independent | None:
        """What bounds the work from above, where something is proven to."""
        plate = self.solution.plate
        outline = plate.outline
        rim = [plate.support(name) for name in outline.rim.sides]
        holes = [plate.support(n) for hole in outline.holes for n in hole.sides]
        if not all(s.holds_slope and s.holds_deflection for s in holes):
            return None
        if all(s.holds_slope and s.holds_deflection for s in rim):
            word = "clamped"
        elif self.one_way and _convex(plate) and all(s.holds_deflection for s in rim):
            word = "simply supported"
        else:
            return None
        frame, ends = frame_around(plate), (word,) * 4
        if (outline.boundaries[0].bulges != 0.0).any():
            frame = frame.wider(MARGIN)
        shaped = self._bent(frame, ends, _stiffness_shares(plate)[0])
        return None if shaped is None else self._work("upper", frame, ends, shaped)

    def lower(self) -> Independent | None:
        """The clamped disc inside that does most work."""
        plate = self.solution.plate
        centres, radii = _discs(self.solution, self.places, self.forces)
        if not len(radii):
            return None
        h, material = plate.sections[0]
        D = material.bending_stiffness(h) * _stiffness_shares(plate)[1]
        work = clamped_disc_work(centres, radii, self.places, self.forces, D=D)
        best = int(np.argmax(work))
        if not work[best] > 0.0:
            return None
        size, held = (float(radii[best]),), ("clamped",)
        formula = "Ritz's method with (1 - r^2/R^2)^2"
        return self._of_work("lower", "disc", size, held, formula, float(work[best]))

    def _disc(self) -> Independent | None:
        """A disc under an even pressure."""
        plate, rim = self.solution.plate, self.solution.plate.outline.rim
        assert isinstance(rim, Circle)
        loads = self.solution.state.cases[self.solution.cases.index(self.case)].loads
        support = plate.support(rim.name)
        even = all(isinstance(load, Pressure | SelfWeight) for load in loads)
        if not (even and support.holds_deflection) or plate.outline.zones:
            return None
        h, material = plate.sections[0]
        pressure = 0.0
        for load in loads:
            if isinstance(load, Pressure):
                pressure += load.value
            elif isinstance(load, SelfWeight):
                pressure += (material.density or 0.0) * h * load.acceleration
        value = disc_centre(
            pressure,
            rim.radius,
            D=material.bending_stiffness(h),
            nu=material.nu,
            clamped=support.holds_slope,
        )
        found = self.solution.deflection([rim.centre], case=self.case)[0]
        formula = "p a^4/64D"
        if not support.holds_slope:
            formula += " (5 + nu)/(1 + nu)"
        return Independent(
            case=self.case,
            relation="same",
            shape="disc",
            size=(rim.radius,),
            supports=(support.name,),
            formula=formula,
            quantity="deflection",
            found=abs(float(found)),
            value=abs(value),
        )

    def _bent(self, frame: Frame, ends: Ends, share: float = 1.0) -> Shaped | None:
        h, material = self.solution.plate.sections[0]
        return rectangle(
            frame.size,
            ends,
            frame.own(self.places),
            self.forces,
            D=share * material.bending_stiffness(h),
            nu=material.nu,
        )

    def _at_peak(
        self, relation: Relation, frame: Frame, ends: Ends
    ) -> Independent | None:
        """The deflection of a rectangle where that of the plate peaks."""
        shaped = self._bent(frame, ends)
        peak = self.solution.peak("deflection", case=self.case)
        if shaped is None or peak.place is None:
            return None
        value = shaped.deflection(frame.own(np.array([peak.place])))[0]
        return Independent(
            case=self.case,
            relation=relation,
            shape="rectangle",
            size=frame.size,
            supports=_words(ends),
            formula=_formula(ends),
            quantity="deflection",
            found=abs(peak.value),
            value=abs(float(value)),
        )

    def _work(
        self, relation: Relation, frame: Frame, ends: Ends, shaped: Shaped
    ) -> Independent:
        """The work of the loads on a rectangle."""
        work = float(self.forces @ shaped.deflection(frame.own(self.places)))
        return self._of_work(
            relation, "rectangle", frame.size, _words(ends), _formula(ends), work
        )

    def _of_work(
        self,
        relation: Relation,
        shape: str,
        size: tuple[float, ...],
        supports: tuple[str, ...],
        formula: str,
        work: float,
    ) -> Independent:
        found = self.solution.load_work(case=self.case)
        total = abs(float(self.forces.sum())) if self.one_way else 1.0
        return Independent(
            case=self.case,
            relation=relation,
            shape=shape,
            size=size,
            supports=supports,
            formula=formula,
            quantity="mean deflection" if self.one_way else "work",
            found=found / total,
            value=work / total,
        )


def _words(ends: Ends) -> tuple[str, ...]:
    """Supports south, east, north, west; one word if alike."""
    west, east, south, north = ends
    return (west,) if len(set(ends)) == 1 else (south, east, north, west)


def _formula(ends: Ends) -> str:
    return "Navier's series" if set(ends) == {"simply supported"} else "Ritz's method"


def _held_inside(plate: Plate) -> list[str]:
    """Names of held seams and marks."""
    outline = plate.outline
    names = [seam.name for seam in outline.seams] + [m.name for m in outline.marks]
    return [name for name in names if plate.support(name).holds]


def _stiffness_shares(plate: Plate) -> tuple[float, float]:
    """Least and largest share of the plate's rigidity in any bending of a section."""
    root = np.linalg.inv(np.linalg.cholesky(plate.rigidities[0]))
    shares = np.linalg.eigvalsh(root @ plate.rigidities @ root.T)
    return float(shares.min()), float(shares.max())


def _convex(plate: Plate) -> bool:
    """Whether the rim is a convex polygon."""
    line = plate.outline.boundaries[0]
    if isinstance(plate.outline.rim, Circle) or (line.bulges != 0.0).any():
        return False
    step = np.roll(line.points, -1, axis=0) - line.points
    after = np.roll(step, -1, axis=0)
    cross = step[:, 0] * after[:, 1] - step[:, 1] * after[:, 0]
    return bool((cross >= -(SNAP**2) * plate.outline.size**2).all())


def _discs(solution: Solution, places: Floats, forces: Floats) -> tuple[Floats, Floats]:
    """Discs inside, clear of rims and of what is held inside: centres and radii."""
    plate, mesh = solution.plate, solution.mesh
    start, end = np.moveaxis(mesh.points[mesh.boundary_edges], 1, 0)
    for name in _held_inside(plate):
        vertices, edges = settled_vertices(mesh, name)
        pairs = edges if len(edges) else np.column_stack([vertices, vertices])
        a, b = np.moveaxis(mesh.points[pairs], 1, 0)
        start, end = np.concatenate([start, a]), np.concatenate([end, b])
    centres = mesh.points[mesh.triangles].mean(axis=1)
    size = np.abs(forces)
    middle = (size @ places) / size.sum()
    most = places[size.argmax()]
    extra = np.array([middle, most])
    centres = np.concatenate([centres, extra[mesh.covers(extra)]])
    if len(centres) > 5 * DISCS:
        centres = centres[:: len(centres) // (5 * DISCS)]
    radii = np.array([_clearance(c, start, end) for c in centres])
    # Chords of a hollow arc are nearer than the arc by no more than what is taken off.
    radii *= 0.995
    near = np.hypot(*(centres - middle).T)
    order = np.argsort(-(radii - 0.5 * near))[: DISCS // 2]
    order = np.union1d(order, np.argsort(-radii)[: DISCS // 2])
    order = order[radii[order] > SNAP * plate.outline.size]
    return centres[order], radii[order]


def _clearance(place: Floats, start: Floats, end: Floats) -> float:
    """Distance from a place to segments."""
    step = end - start
    length = np.maximum(np.einsum("kc,kc->k", step, step), np.finfo(float).tiny)
    share = np.clip(np.einsum("kc,kc->k", place - start, step) / length, 0.0, 1.0)
    return float(np.hypot(*(start + share[:, None] * step - place).T).min())
