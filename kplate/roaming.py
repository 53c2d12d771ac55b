"""A patch that may stand anywhere: a wheel, a foot, and the worst it does.

The patch is set down on a lattice of places, all solved with one factorisation. At
every place deflection and stress are looked at on a lattice of each triangle; the
governing place of each result is then sought on finer and finer stencils around the
worst of the lattice, by more right-hand sides of the same factorisation.

What comes out is the worst of the places that were tried, no bound over all of them: no
band is given. The place that governs can be solved to a tolerance as a case of its own.
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from typing import Literal

import numpy as np

from kplate.adapt import solve
from kplate.arrays import Bools, Floats, Ints
from kplate.errors import InputError
from kplate.extremes import corner_extreme
from kplate.goals import Place
from kplate.loads import Case, RectanglePatch
from kplate.patches import Patch, Roaming, fits, placements
from kplate.peaks import QUANTITIES, Candidates, measures
from kplate.plate import Plate
from kplate.polygon import SNAP
from kplate.raw import RawMoments
from kplate.recovery import von_mises
from kplate.rims import outside
from kplate.samples import Lattice
from kplate.singular import plate_corners
from kplate.solution import Solution
from kplate.solve.static import Progress, StaticState
from kplate.values import Value

BLOCK = 32  # places solved at once
STEPS = 4  # of the lattice on each triangle that fields are looked at on
ZOOMS = 5  # stencils, each half the last, around the worst place
STENCIL = [(i, j) for i in (-1, 0, 1) for j in (-1, 0, 1) if (i, j) != (0, 0)]
# Triangles of the mesh have edges of this share of the patch, or `FINEST` triangles.
EDGE, COARSEST, FINEST = 0.5, 400, 4000
# Places closer than this share of a step are one.
SAME = 1e-6
HOLD_DOWN: Literal["hold-down"] = "hold-down"


@dataclass(frozen=True, kw_only=True)
class Governing:
    """Where a roaming patch makes most of one quantity.

    Parameters
    ----------
    quantity : str
        A quantity of `Solution.peak`, or "hold-down", the largest pull of a corner.
    value : Value
        That, and where on the plate it is; without a band.
    place : tuple of float
        Centre of the patch in m.
    first : Value
        The worst of the lattice of places, before the place was refined.
    """

    quantity: str
    value: Value
    place: Place
    first: Value


@dataclass(frozen=True, eq=False, kw_only=True)
class Roamed:
    """What a roaming patch does.

    Parameters
    ----------
    roaming : Roaming
        What was asked.
    solution : Solution
        The plate, solved with the patch at the first place.
    places : ndarray, shape (k, 2)
        Centres of the patch that were tried, the lattice.
    governing : tuple of Governing
        The worst of each quantity.
    points : ndarray, shape (n, 2)
        Places of the fields in m.
    triangles : ndarray, shape (m, 3)
        Numbers of the points of each small triangle.
    lowest, highest : ndarray, shape (n,)
        Envelope of the deflection over all places, in m.
    von_mises : ndarray, shape (n,)
        Envelope of the von Mises stress in Pa, the worst over all places.
    worst_place : ndarray, shape (n,)
        Number of the place that makes the von Mises stress at each point.
    solves : int
        Right-hand sides that were solved, with one factorisation.
    """

    roaming: Roaming
    solution: Solution
    places: Floats
    governing: tuple[Governing, ...]
    points: Floats
    triangles: Ints
    lowest: Floats
    highest: Floats
    von_mises: Floats
    worst_place: Ints
    solves: int

    @property
    def cases(self) -> tuple[tuple[Case, tuple[str, ...]], ...]:
        """The patch at its governing places as load cases, and what each governs."""
        roaming = self.roaming
        found: dict[tuple[int, ...], tuple[Place, list[str]]] = {}
        for own in self.governing:
            if own.value.value == 0.0 or math.isnan(own.value.value):
                continue
            key = tuple(round(x / (SAME * roaming.step)) for x in own.place)
            found.setdefault(key, (own.place, []))[1].append(own.quantity)
        names = [roaming.name]
        if len(found) > 1:
            names = [f"{roaming.name} {k}" for k in range(1, len(found) + 1)]
        return tuple(
            (Case(name=name, loads=[*roaming.loads, roaming.at(at)]), tuple(own))
            for name, (at, own) in zip(names, found.values(), strict=False)
        )


def roam(
    plate: Plate,
    roaming: Roaming,
    *,
    quantities: Sequence[str] = ("deflection", "von Mises", HOLD_DOWN),
    triangles: int | None = None,
    element: str = "auto",
    progress: Progress | None = None,
) -> Roamed:
    """Set a patch down all over a plate and find the worst it does.

    Parameters
    ----------
    plate : Plate
        The statement.
    roaming : Roaming
        The patch, where it may be, and what acts with it.
    quantities : sequence of str, optional
        Those of `Solution.peak`, and "hold-down".
    triangles : int, optional
        About how many triangles to use; as many as make their edges half the patch if
        left out, at most 4,000.
    element : str, optional
        As in `solve`.
    progress : callable, optional
        Called with a stage and the fraction done.

    Returns
    -------
    Roamed

    Raises
    ------
    InputError
        If the patch fits nowhere, there are too many places, or a load does not fit.
    MeshError, SolveError
        If the plate cannot be meshed or solved.
    """
    known = [q for q in (*QUANTITIES, HOLD_DOWN) if q != "shear stress"]
    for quantity in quantities:
        if quantity not in known:
            raise InputError(
                f"{quantity!r} is not sought over places; what is are "
                f"{', '.join(known)}."
            )
    places = placements(plate, roaming)
    least = min(_lengths(roaming.patch))
    wanted = plate.outline.area / (math.sqrt(3.0) / 4.0 * (EDGE * least) ** 2)
    count = triangles or int(np.clip(wanted, COARSEST, FINEST))
    x, y = places[0].tolist()
    first = Case(name="first", loads=[*roaming.loads, roaming.at((x, y))])
    solution = solve(plate, [first], triangles=count, element=element)
    search = _Search(solution=solution, roaming=roaming)
    envelope = _Envelope.over(search, places, quantities, progress)
    governing = tuple(search.refined(q, envelope.worst(q)) for q in quantities)
    points, small = search.lattice
    return Roamed(
        roaming=roaming,
        solution=solution,
        places=places,
        governing=governing,
        points=points,
        triangles=small,
        lowest=envelope.lowest,
        highest=envelope.highest,
        von_mises=envelope.von_mises,
        worst_place=envelope.numbers,
        solves=len(search.solved),
    )


def _lengths(patch: Patch) -> Place:
    if isinstance(patch, RectanglePatch):
        return patch.size
    return 2.0 * patch.radius, 2.0 * patch.radius


@dataclass(eq=False)
class _Search:
    """Solves places, and looks at what they make on a lattice of each triangle."""

    solution: Solution
    roaming: Roaming

    def __post_init__(self) -> None:
        self.solved: set[Place] = set()

    @cached_property
    def lattice(self) -> tuple[Floats, Ints]:
        """Points (n, 2) and small triangles (m, 3)."""
        mesh, own = self.solution.mesh, Lattice.of(STEPS)
        points = own.barycentrics @ mesh.points[mesh.triangles]
        first = len(own.barycentrics) * np.arange(len(mesh.triangles))
        small = first[:, None, None] + own.triangles
        return points.reshape(-1, 2), small.reshape(-1, 3)

    @cached_property
    def owners(self) -> Ints:
        """Triangle of each point of the lattice."""
        count = len(Lattice.of(STEPS).barycentrics)
        return np.repeat(np.arange(len(self.solution.mesh.triangles)), count)

    @cached_property
    def thickness(self) -> Floats:
        """Thickness at each point of the lattice."""
        own: Floats = self.solution.plate.thicknesses[
            self.solution.mesh.zones[self.owners]
        ]
        return own

    @cached_property
    def judged(self) -> Bools:
        """Points of the lattice outside the discs left out."""
        return outside(self.lattice[0], self.solution.excluded, 1.0)

    @cached_property
    def _rows(self) -> Floats:
        """What unknowns of a triangle make of w and the moments, (n, q 4, d)."""
        solution = self.solution
        mesh, element = solution.mesh, solution.state.element
        vertices = mesh.points[mesh.triangles]
        own = Lattice.of(STEPS).barycentrics
        at = np.broadcast_to(own, (len(vertices), *own.shape))
        w = element.evaluate(vertices, at)[:, :, :1]
        bends = element.curvature(vertices, at)
        moments = solution.plate.rigidities[mesh.zones][:, None] @ bends
        rows = np.concatenate([w, moments], axis=2)
        return rows.reshape(len(vertices), -1, rows.shape[-1])

    @cached_property
    def _fixed(self) -> Floats:
        """Forces of what acts at the same time."""
        return self.solution.system.forces(self.roaming.loads)

    @cached_property
    def _corners(self) -> list[Place]:
        """Corners that bring a force of finite size."""
        return [
            corner.place
            for corner in plate_corners(self.solution.plate)
            if corner.carries_force and not corner.unbounded
        ]

    def state(self, places: Sequence[Place]) -> StaticState:
        """The plate with the patch at some places, a case each."""
        system, roaming = self.solution.system, self.roaming
        cases = [
            Case(name=str(k), loads=[*roaming.loads, roaming.at(place)])
            for k, place in enumerate(places)
        ]
        forces = [system.forces([roaming.at(place)]) for place in places]
        self.solved.update(places)
        return system.state(cases, self._fixed[:, None] + np.column_stack(forces))

    def fields(self, state: StaticState) -> tuple[Floats, Floats]:
        """Deflection (n, c) and moments (n, 3, c) on the lattice."""
        table = state.constraints.numbering.table
        found = self._rows @ state.unknowns[table]
        found = found.reshape(len(self.owners), 4, -1)
        return found[:, 0], found[:, 1:]

    def sizes(
        self, quantity: str, state: StaticState, fields: tuple[Floats, Floats]
    ) -> Floats:
        """About the peak of a quantity in each case of a state, (c,)."""
        w, moments = fields
        if quantity == "deflection":
            return np.abs(w).max(axis=0)
        if quantity == HOLD_DOWN:
            return self._pulls(state)
        points = self.lattice[0][self.judged]
        nothing = np.zeros((len(points), 2))
        h, owners = self.thickness[self.judged], self.owners[self.judged]
        found = []
        for own in np.moveaxis(moments[self.judged], 2, 0):
            at = Candidates(points, own, nothing, h, owners)
            size = measures(quantity, at, own, nothing)[0]
            found.append(float(size.max(initial=0.0)))
        return np.array(found)

    def _pulls(self, state: StaticState) -> Floats:
        """Largest pull of a corner in each case of a state, (c,)."""
        if not self._corners:
            return np.zeros(len(state.cases))
        if not state.element.conforming:
            own = Solution(state=state)
            names = own.cases
            return np.array(
                [corner_extreme(own, HOLD_DOWN, case=n)[0].value for n in names]
            )
        traces = RawMoments(state=state).traces
        points = state.mesh.points[traces.vertices]
        places = np.array(self._corners)
        off = np.hypot(*np.moveaxis(points[:, None] - places, -1, 0)).min(axis=1)
        at = off < SNAP * state.plate.outline.size
        pulls: Floats = (-traces.forces[at]).max(axis=0, initial=0.0)
        return pulls

    def exact(self, quantity: str, place: Place) -> Value:
        """The quantity with the patch at a place, as a solution has it."""
        solution = replace(self.solution, state=self.state([place]))
        if quantity == HOLD_DOWN:
            return corner_extreme(solution, HOLD_DOWN, case="0")[0]
        return solution.peak(quantity, case="0")

    def refined(self, quantity: str, place: Place) -> Governing:
        """Seek the place that governs around the worst of the lattice of places."""
        plate, roaming = self.solution.plate, self.roaming
        first = self.exact(quantity, place)
        best, most, reach = place, -math.inf, roaming.step
        for _ in range(ZOOMS):
            reach /= 2.0
            around = [(best[0] + i * reach, best[1] + j * reach) for i, j in STENCIL]
            around = [best, *(own for own in around if fits(plate, roaming, own))]
            state = self.state(around)
            sizes = self.sizes(quantity, state, self.fields(state))
            if sizes.max() > most:
                top = int(np.argmax(sizes))
                best, most = around[top], float(sizes[top])
        value = self.exact(quantity, best)
        if not abs(value.value) > abs(first.value):
            best, value = place, first
        return Governing(
            quantity=quantity,
            value=replace(value, case=roaming.name),
            place=best,
            first=replace(first, case=roaming.name),
        )


@dataclass(eq=False)
class _Envelope:
    """The worst over all places, point by point, and place by place."""

    places: Floats
    lowest: Floats
    highest: Floats
    von_mises: Floats
    numbers: Ints
    sizes: dict[str, Floats]

    @classmethod
    def over(
        cls,
        search: _Search,
        places: Floats,
        quantities: Sequence[str],
        progress: Progress | None,
    ) -> "_Envelope":
        """Solve all places, block by block."""
        n = len(search.owners)
        found = cls(
            places=places,
            lowest=np.full(n, np.inf),
            highest=np.full(n, -np.inf),
            von_mises=np.full(n, -np.inf),
            numbers=np.zeros(n, dtype=np.int64),
            sizes={quantity: np.empty(len(places)) for quantity in quantities},
        )
        for start in range(0, len(places), BLOCK):
            if progress is not None:
                progress(f"{search.roaming.name}, places", start / len(places))
            block = [(x, y) for x, y in places[start : start + BLOCK].tolist()]
            state = search.state(block)
            w, moments = search.fields(state)
            found.lowest = np.minimum(found.lowest, w.min(axis=1))
            found.highest = np.maximum(found.highest, w.max(axis=1))
            bending = 6.0 / search.thickness**2
            stress = bending[:, None] * von_mises(np.moveaxis(moments, 1, 2))
            worst = stress.argmax(axis=1)
            size = stress[np.arange(n), worst]
            larger = size > found.von_mises
            found.von_mises[larger] = size[larger]
            found.numbers[larger] = start + worst[larger]
            for quantity, sizes in found.sizes.items():
                sizes[start : start + len(block)] = search.sizes(
                    quantity, state, (w, moments)
                )
        return found

    def worst(self, quantity: str) -> Place:
        """Place of the lattice that makes most of a quantity."""
        x, y = self.places[int(np.argmax(self.sizes[quantity]))].tolist()
        return x, y
