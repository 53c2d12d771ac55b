"""Solved unit cases, and the peaks of their sums, sought without solving again.

A peak of a sum is sought, and its band made, as `Solution` does it: on the samples, the
rims of discs that are left out, and finer lattices where the largest lie. What is
looked up again and again is kept: the dual at the samples, the lattices, the rims.
Triangles on which the sum cannot be large, since a stress of a sum is no more than the
sum of the stresses, are passed over.
"""

from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from functools import cached_property
from typing import Any, NamedTuple

import numpy as np

from kplate import assembly
from kplate.arrays import Bools, Floats, Ints
from kplate.elements.arcs import Arcs
from kplate.peaks import FACTOR, Candidates, climb, doubts, extreme, measures, peak_band
from kplate.recovery import principal_moments, von_mises
from kplate.rims import outside, rim
from kplate.samples import Lattice
from kplate.searched import CLOSE, FINE, MOST
from kplate.singular import Excluded
from kplate.solution import Solution
from kplate.summits import deflected, deflection_gaps
from kplate.values import Value, scaled
from kplate.woodarmer import DESIGN

# A summit is sought by so many steps at most, until one is this share of a triangle.
_NEWTON, _SLIGHT = 12, 1e-9
_FIRST = 64  # triangles that are tried to see how large a peak is at least

Judged = tuple[Candidates, Floats, Floats, Bools]


class Parts(NamedTuple):
    """Places with what each unit case makes there, (k, ..., units).

    `off` and `shears_off` are by how much the dual differs.
    """

    places: Floats
    triangles: Ints
    thickness: Floats
    moments: Floats
    shears: Floats
    off: Floats
    shears_off: Floats

    @classmethod
    def joined(cls, parts: "Sequence[Parts]") -> "Parts":
        """All of some, one after the other."""
        columns: Any = zip(*parts, strict=True)
        return cls(*(np.concatenate(own) for own in columns))

    def at(self, kept: Bools) -> "Parts":
        """Those that are kept."""
        columns: Any = self
        return Parts(*(own[kept] for own in columns))

    def summed(self, weights: Floats) -> tuple[Candidates, Floats, Floats]:
        """Candidates under a sum of unit cases, and the dual's moments and shears."""
        moments, shears = self.moments @ weights, self.shears @ weights
        at = Candidates(self.places, moments, shears, self.thickness, self.triangles)
        return at, moments - self.off @ weights, shears - self.shears_off @ weights


@dataclass(frozen=True, eq=False, kw_only=True)
class Basis:
    """Solved unit cases, and what was found of their sums so far.

    Parameters
    ----------
    solution : Solution
        The plate in its unit cases, of C1 elements.
    """

    solution: Solution
    _pool: dict[int, Parts] = field(default_factory=dict, init=False)
    _rims: dict[object, Parts] = field(default_factory=dict, init=False)
    _found: dict[object, Value] = field(default_factory=dict, init=False)
    _bounds: dict[str, tuple[Floats, Floats]] = field(default_factory=dict, init=False)
    _polynomials: dict[tuple[int, int], tuple[Floats, float, Floats]] = field(
        default_factory=dict, init=False
    )

    def peak(
        self, quantity: str, weights: Floats, discs: Sequence[Excluded], case: str
    ) -> Value:
        """Peak of a sum of unit cases, as `Solution.peak`.

        Parameters
        ----------
        quantity : str
            As there.
        weights : ndarray, shape (n_units,)
            How much of each unit case makes the sum.
        discs : sequence of Excluded
            What is left out.
        case : str
            Name of the sum.
        """
        size = float(np.abs(weights).max(initial=0.0))
        if size == 0.0:
            return Value(value=0.0, case=case)
        shape = weights / size
        left_out = tuple((disc.place, disc.radius) for disc in discs)
        if quantity == "deflection":
            left_out = ()
        key = (quantity, tuple(shape.tolist()), left_out)
        if key not in self._found:
            self._found[key] = self._peak(quantity, shape, discs)
        return replace(scaled(self._found[key], size), case=case)

    @cached_property
    def works(self) -> Floats:
        """Work in J of each unit case's moments on the curvatures of each."""
        state = self.solution.state
        numbering, mesh = state.constraints.numbering, self.solution.mesh
        total = np.zeros((len(state.cases),) * 2)
        for block, K in assembly.element_stiffness(
            state.plate, numbering, state.element
        ):
            bent = assembly.without_rigid_motion(
                state.unknowns[numbering.table[block]],
                mesh.points[mesh.triangles[block]],
                numbering,
            )
            total += np.einsum("nic,nid->cd", bent, K @ bent)
        return total

    def _peak(self, quantity: str, weights: Floats, discs: Sequence[Excluded]) -> Value:
        if quantity == "deflection":
            value, place = self._summit(weights)
            found = Value(value=value, place=place)
            low, high = self._deflection_band(weights)
        else:
            judged = self._judged(quantity, weights, discs)
            if judged is None:
                return Value(
                    value=np.nan,
                    reason="is not known: the places left out cover the plate",
                )
            value, place, face = extreme(quantity, judged[0])
            found = Value(value=value, place=place, face=face)
            low, high = self._band(quantity, judged)
        if self.solution.dual is None:
            return found
        low, high = min(low, abs(value)), max(high, abs(value))
        low, high = (low, high) if value >= 0.0 else (-high, -low)
        return replace(found, lower=low, upper=high, kind="estimate")

    def _judged(
        self, quantity: str, weights: Floats, discs: Sequence[Excluded]
    ) -> Judged | None:
        """Places to judge a sum at, the dual's there, and which of them may peak.

        None where discs cover the plate.
        """
        samples, fixed = self._samples, []
        outer = outside(samples.places, discs, 1.0) if discs else None
        if discs:
            rims = Parts.joined([self._rim(disc) for disc in discs])
            fixed = [rims.at(outside(rims.places, discs, 1.0 - 1e-9))]
        may = self._may_peak(quantity, weights, outer)
        for part in fixed:
            may[part.triangles] = True
        chosen = self._touching(may)[samples.triangles]
        if outer is not None:
            chosen &= outer
        found = [own.summed(weights) for own in (samples.at(chosen), *fixed)]
        found = [own for own in found if len(own[0].places)]
        if not found:
            return None
        size = np.concatenate(
            [measures(quantity, a, a.moments, a.shears)[0] for a, *_ in found]
        )
        triangles = np.concatenate([own.triangles for own, *_ in found])
        order = np.argsort(-size, kind="stable")
        close = order[size[order] >= (1.0 - CLOSE) * size[order[0]]]
        fine = self._lattices(np.unique(triangles[close][:MOST]))
        if discs:
            fine = fine.at(outside(fine.places, discs, 1.0))
        found.append(fine.summed(weights))
        ats, *duals = zip(*found, strict=True)
        at = Candidates(*(np.concatenate(own) for own in zip(*ats, strict=True)))
        moments, shears = (np.concatenate(own) for own in duals)
        return at, moments, shears, may[at.triangles]

    def _may_peak(self, quantity: str, weights: Floats, outer: Bools | None) -> Bools:
        """Triangles on which a sum may peak, or end its band, (n_triangles,)."""
        samples = self._samples
        n = len(self.solution.mesh.triangles)
        sizes, offs = self._bounds_of(quantity)
        most = sizes @ np.abs(weights)
        vertices = self.solution.mesh.triangles
        at_vertex = np.zeros(len(self.solution.mesh.points))
        np.maximum.at(at_vertex, vertices, (offs @ np.abs(weights))[:, None])
        doubt = FACTOR * at_vertex[vertices].max(axis=1)
        free = np.ones(n, dtype=bool)
        if outer is not None:
            free = np.zeros(n, dtype=bool)
            free[samples.triangles[outer]] = True
            touched = np.zeros(n, dtype=bool)
            touched[samples.triangles[~outer]] = True
            tried = np.flatnonzero(free & ~touched)
        else:
            tried = np.arange(n)
        if len(tried) <= _FIRST:
            return free
        tried = tried[np.argpartition(-most[tried], _FIRST)[:_FIRST]]
        first = np.zeros(n, dtype=bool)
        first[tried] = True
        at = samples.at(first[samples.triangles]).summed(weights)[0]
        size = measures(quantity, at, at.moments, at.shears)[0]
        size = size * _lever(quantity, at.thickness)
        best = int(np.argmax(size))
        least = min((1.0 - CLOSE) * size[best], size[best] - doubt[at.triangles[best]])
        large: Bools = np.logical_and(free, most + doubt >= least)
        return large

    def _touching(self, chosen: Bools) -> Bools:
        """Triangles that are chosen, and their neighbours."""
        mesh = self.solution.mesh
        near = np.zeros(len(mesh.points), dtype=bool)
        near[mesh.triangles[chosen]] = True
        return np.any(near[mesh.triangles], axis=1)

    def _bounds_of(self, quantity: str) -> tuple[Floats, Floats]:
        """Largest size of each unit case on each triangle, and of the dual's gap.

        Returns
        -------
        sizes, offs : ndarray, shape (n_triangles, n_units)
            In norms that no measure of the quantity exceeds.
        """
        alone = ("largest principal", "smallest principal", "m_xx", "m_yy", "m_xy")
        kind = "principal" if quantity in alone else quantity
        if kind not in self._bounds:
            samples, n = self._samples, len(self.solution.mesh.triangles)
            if kind == "shear stress":
                both = samples.shears, samples.shears_off
            else:
                both = samples.moments, samples.off
            found = []
            for fields in both:
                own = np.zeros((n, fields.shape[-1]))
                np.maximum.at(own, samples.triangles, _norm(kind, fields))
                found.append(own)
            self._bounds[kind] = found[0], found[1]
        return self._bounds[kind]

    def _band(self, quantity: str, judged: Judged) -> tuple[float, float]:
        """Band of a peak among places."""
        at, moments, shears, may = judged
        values, differences = measures(quantity, at, moments, shears)
        doubt = doubts(self.solution.mesh, at.triangles, differences)[at.triangles]
        return float((values - doubt)[may].max()), float((values + doubt)[may].max())

    def _deflection_band(self, weights: Floats) -> tuple[float, float]:
        if self.solution.dual is None:
            return 0.0, 0.0
        _, holders, w = self._deflected
        sizes, off = np.abs(w @ weights), np.abs(self._lifted @ weights)
        band = peak_band(self.solution.mesh, holders, sizes, off)
        return band.lower, band.upper

    @cached_property
    def _samples(self) -> Parts:
        """The samples of the solution."""
        solution, samples = self.solution, self.solution.samples
        at = solution.mesh.barycentrics(samples.holders, samples.points)[:, None]
        moments, shears = samples.moments, samples.shears
        off, shears_off = np.zeros_like(moments), np.zeros_like(shears)
        if solution.dual is not None:
            off = moments - solution.dual.moments_at(samples.holders, at)[:, 0]
            shears_off = shears - solution.dual.shears_at(samples.holders, at)[:, 0]
        return Parts(
            samples.points,
            samples.holders,
            solution.plate.thicknesses[samples.sections],
            moments,
            shears,
            off,
            shears_off,
        )

    @cached_property
    def _lifted(self) -> Floats:
        """By how much the dual's deflection differs there, (n, units)."""
        state, dual = self.solution.state, self.solution.dual
        assert dual is not None
        return deflection_gaps(state, dual, self.solution.recovered)

    @property
    def _deflected(self) -> tuple[Floats, Ints, Floats]:
        """Places, triangles that hold them, and w of each unit there."""
        return deflected(self.solution.recovered)

    def _summit(self, weights: Floats) -> tuple[float, tuple[float, float]]:
        """Go from the sample that deflects most to the summit beside it."""
        solution, (places, holders, every) = self.solution, self._deflected
        w = every @ weights
        best = int(np.argmax(np.abs(w)))
        start, holder = (float(w[best]), places[best]), int(holders[best])
        found = self._stationary(weights, start, holder)
        if found is not None:
            return found
        size = float(np.sqrt(2.0 * solution.mesh.areas[holder]))
        return climb(
            lambda points: self._deflections(points, weights),
            solution.mesh,
            start,
            size,
        )

    def _stationary(
        self, weights: Floats, start: tuple[float, Floats], holder: int
    ) -> tuple[float, tuple[float, float]] | None:
        """Summit beside a place by Newton's method, if it leads to one."""
        mesh = self.solution.mesh
        least, place = start
        size = float(np.sqrt(2.0 * mesh.areas[holder]))
        for _ in range(_NEWTON):
            inside = mesh.barycentrics(np.array([holder]), place[None])
            if inside.min() < -_SLIGHT:
                if not mesh.covers(place[None])[0]:
                    return None
                triangles, inside = mesh.locate(place[None])
                holder = int(triangles[0])
            if len(self._arcs(np.array([holder]))):
                return None  # no polynomial beside a round edge
            centre, unit, coefficients = self._polynomial(holder, inside[0])
            w, slope, bend = _jet((place - centre) / unit, coefficients @ weights)
            if not (np.linalg.det(bend) > 0.0 and bend[0, 0] * w < 0.0):
                return None  # not the cap of a summit
            step = -unit * np.linalg.solve(bend, slope)
            if np.hypot(*step) > size:
                return None
            if np.hypot(*step) < _SLIGHT * size:
                x, y = place.tolist()
                return (w, (x, y)) if abs(w) >= abs(least) else None
            place = place + step
        return None

    def _polynomial(
        self, triangle: int, inside: Floats
    ) -> tuple[Floats, float, Floats]:
        """Deflection of each unit case around a place, as a polynomial.

        Returns
        -------
        centre, unit
            What the coordinates are measured from, and in.
        coefficients : ndarray, shape (terms, n_units)
        """
        state, mesh = self.solution.state, self.solution.mesh
        pieces = state.element.pieces
        local = [inside @ np.linalg.inv(piece) for piece in pieces]
        piece = int(np.argmax([own.min() for own in local]))
        if (triangle, piece) not in self._polynomials:
            degree = state.element.curvature_degree + 2
            at = Lattice.of(degree).barycentrics @ pieces[piece]
            vertices = mesh.points[mesh.triangles[[triangle]]]
            rows = state.element.evaluate(vertices, at)[0, :, 0]
            own = state.unknowns[state.constraints.numbering.table[triangle]]
            places = at @ vertices[0]
            centre = places.mean(axis=0)
            unit = float(np.ptp(places, axis=0).max())
            terms = _terms((places - centre) / unit, degree)
            coefficients = np.linalg.solve(terms, rows @ own)
            self._polynomials[triangle, piece] = centre, unit, coefficients
        return self._polynomials[triangle, piece]

    def _deflections(self, points: Floats, weights: Floats) -> Floats:
        """Deflection of a sum at points (k, 2), (k,)."""
        state, mesh = self.solution.state, self.solution.mesh
        triangles, barycentrics = mesh.locate(points)
        vertices = mesh.points[mesh.triangles[triangles]]
        arcs = self._arcs(triangles)
        rows = state.element.evaluate(vertices, barycentrics[:, None], arcs)[:, 0, 0]
        own = state.unknowns[state.constraints.numbering.table[triangles]] @ weights
        deflections: Floats = np.einsum("kd,kd->k", rows, own)
        return deflections

    def _arcs(self, triangles: Ints) -> Arcs:
        """Round edges of triangles."""
        return self.solution.state.constraints.numbering.arcs.among(triangles)

    def _lattices(self, triangles: Ints) -> Parts:
        """Fine lattices on triangles."""
        new = [t for t in triangles.tolist() if t not in self._pool]
        if new:
            lattice = Lattice.of(FINE).barycentrics
            bent = self._arcs(np.array(new)).bent(lattice, len(new))
            whole, q = self._parts_on(np.array(new), bent), len(lattice)
            for i, t in enumerate(new):
                own = slice(i * q, (i + 1) * q)
                columns: Any = whole
                self._pool[t] = Parts(*(part[own] for part in columns))
        return Parts.joined([self._pool[t] for t in triangles.tolist()])

    def _rim(self, disc: Excluded) -> Parts:
        """Rim of a disc."""
        key = (disc.place, disc.radius)
        if key not in self._rims:
            points = rim(self.solution.mesh, disc)
            if len(points):
                triangles, inside = self.solution.mesh.locate(points)
                self._rims[key] = self._parts_on(triangles, inside[:, None])
            else:
                none = np.zeros(len(self._samples.places), dtype=bool)
                self._rims[key] = self._samples.at(none)
        return self._rims[key]

    def _parts_on(self, triangles: Ints, barycentrics: Floats) -> Parts:
        """Unit cases at points of triangles, (q, 3) or (n, q, 3)."""
        solution, mesh = self.solution, self.solution.mesh
        moments, shears = solution.fields_on(triangles, barycentrics)
        off, shears_off = np.zeros_like(moments), np.zeros_like(shears)
        if solution.dual is not None:
            off = moments - solution.dual.moments_at(triangles, barycentrics)
            shears_off = shears - solution.dual.shears_at(triangles, barycentrics)
        n, q, _, c = moments.shape
        places = barycentrics @ mesh.points[mesh.triangles[triangles]]
        holders = np.repeat(triangles, q)
        return Parts(
            places.reshape(-1, 2),
            holders,
            solution.plate.thicknesses[mesh.zones[holders]],
            *(own.reshape(n * q, -1, c) for own in (moments, shears, off, shears_off)),
        )


def power(quantity: str) -> int:
    """Power of the thickness that a quantity of given moments or loads falls with."""
    if quantity == "deflection":
        return 3
    if quantity == "shear stress":
        return 1
    return 0 if quantity in ("m_xx", "m_yy", "m_xy", *DESIGN) else 2


def _lever(quantity: str, thickness: Floats) -> Floats:
    """What turns a measure into one of the moments or shears it is made of."""
    own = power(quantity)
    return thickness**own / {0: 1.0, 1: 1.5, 2: 6.0}[own]


def _norm(kind: str, fields: Floats) -> Floats:
    """Norms of moments or shears (n, a, c), (n, c), that no measure exceeds."""
    own = fields.swapaxes(1, 2)
    if kind == "von Mises":
        return von_mises(own)
    if kind == "shear stress":
        sizes: Floats = np.hypot(own[..., 0], own[..., 1])
        return sizes
    # One of the principal moments, or two of them where they are added.
    largest: Floats = np.abs(principal_moments(own)[0]).max(axis=-1)
    return largest if kind == "principal" else 2.0 * largest


def _terms(places: Floats, degree: int) -> Floats:
    """Monomials of x and y up to a degree, (k, terms)."""
    x, y = places.T
    powers = _powers(degree)
    return np.stack([x**i * y**j for i, j in powers], axis=1)


def _powers(degree: int) -> list[tuple[int, int]]:
    return [(k - j, j) for k in range(degree + 1) for j in range(k + 1)]


def _jet(place: Floats, coefficients: Floats) -> tuple[float, Floats, Floats]:
    """Value, slopes and second derivatives of a polynomial."""
    degree = int(np.sqrt(2 * len(coefficients))) - 1
    i, j = np.array(_powers(degree)).T
    x, y = place[0] ** np.arange(degree + 1), place[1] ** np.arange(degree + 1)

    def along(a: int, b: int) -> float:
        factor = np.ones(len(i))
        for k in range(a):
            factor = factor * (i - k)
        for k in range(b):
            factor = factor * (j - k)
        terms = factor * x[np.maximum(i - a, 0)] * y[np.maximum(j - b, 0)]
        return float(terms @ coefficients)

    mixed = along(1, 1)
    bend = np.array([[along(2, 0), mixed], [mixed, along(0, 2)]])
    return along(0, 0), np.array([along(1, 0), along(0, 1)]), bend
