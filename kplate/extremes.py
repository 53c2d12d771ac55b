"""Extremes that limits judge besides peaks: steps, support forces, stress ranges."""

import math
from collections.abc import Callable, Sequence
from dataclasses import replace

import numpy as np

from kplate.arrays import Floats, Ints
from kplate.errors import InputError
from kplate.limits import COMPONENTS, Sense
from kplate.peaks import EVEN, peak_band
from kplate.reactions import CornerForce
from kplate.recovery import principal_moments, surface_stress
from kplate.rims import outside, rim
from kplate.samples import Lattice
from kplate.solution import Solution
from kplate.values import Face, Value

# Points on each edge of a side on which its largest deflection is sought; between two
# of them a bow of the edge's length is missed by a thousandth of it.
STATIONS = 17
FACES: tuple[Face, Face] = ("top", "bottom")
# Around the largest range: triangles with samples so close to it, at most so many of
# them, are sampled on a lattice of so many steps.
_CLOSE, _MOST, _FINE = 0.02, 64, 16


def step(solution: Solution, side: str, *, case: str) -> Value:
    """Largest deflection along a side in m, with its sign and band.

    The band is an estimate, made as that of a peak over the whole plate.

    Raises
    ------
    InputError
        If there is no such side or case.
    """
    mesh = solution.mesh
    if side not in mesh.side_names:
        raise InputError(
            f"there is no side {side!r}; the sides are {', '.join(mesh.side_names)}."
        )
    edges = mesh.boundary_edges[mesh.boundary_sides == mesh.side_names.index(side)]
    triangles = np.repeat(mesh.triangles_at(edges), STATIONS)
    start, end = np.moveaxis(mesh.points[edges], 1, 0)
    share = np.linspace(0.0, 1.0, STATIONS)[:, None]
    places = (start[:, None] + share * (end - start)[:, None]).reshape(-1, 2)
    w = solution.deflection(places, case=case)
    best = int(np.argmax(np.abs(w)))
    x, y = places[best].tolist()
    value = Value(value=float(w[best]), place=(x, y), case=case)
    if solution.dual is None or not solution.state.element.conforming:
        return value
    own = mesh.barycentrics(triangles, places)[:, None]
    other = solution.dual.deflections_at(triangles, own)[:, 0]
    off = np.abs(w - other[:, solution.cases.index(case)])
    band = peak_band(mesh, triangles, np.abs(w), off)
    size = abs(value.value)
    low, high = min(band.lower, size), max(band.upper, size)
    if value.value < 0.0:
        low, high = -high, -low
    return replace(value, lower=low, upper=high, kind="estimate")


def corner_extreme(
    solution: Solution, sense: Sense, *, case: str
) -> tuple[Value, list[CornerForce]]:
    """Largest force of a corner in N, and the corners that need it within 1 %.

    Corners without a finite force are left out and counted in the value's reason. The
    value is 0 where no corner needs one, nan where none is known.
    """
    corners = solution.reactions(case=case).corners
    known = [own for own in corners if not math.isnan(own.force.value)]
    unknown = len(corners) - len(known)
    words = f"not known at {unknown} corner{'s' * (unknown > 1)}" if unknown else ""
    if unknown and not known:
        return Value(value=math.nan, case=case, reason=words), []
    forces = [(_share(own.force, sense), own) for own in known]
    if not forces:
        return Value(value=0.0, case=case), []
    most = max((force for force, _ in forces), key=_unfavourable)
    if most.value <= 0.0:
        return replace(most, case=case, place=None, reason=words), []
    like = [own for force, own in forces if force.value >= 0.99 * most.value]
    return replace(most, case=case, reason=words), like


def side_extreme(
    solution: Solution, sense: Sense, *, case: str, only: Sequence[str] = ()
) -> tuple[Value, str]:
    """Largest line force of a side or seam in N/m, and its name; without a band."""
    sign = -1.0 if sense == "hold-down" else 1.0
    most, name = Value(value=0.0, case=case), ""
    sides = solution.reactions(case=case).sides
    _check_names(only, [side.side for side in sides], "side or seam")
    for side in sides:
        known = ~np.isnan(side.line_reaction)
        if (only and side.side not in only) or not known.any():
            continue
        force = np.where(known, sign * side.line_reaction, -np.inf)
        best = int(np.argmax(force))
        if force[best] > most.value:
            x, y = side.stations[best].tolist()
            most = Value(value=float(force[best]), place=(x, y), case=case)
            name = side.side
    return most, name


def point_extreme(
    solution: Solution, sense: Sense, *, case: str, only: Sequence[str] = ()
) -> tuple[Value, str]:
    """Largest force of a held mark in N, and its name; 0 where none needs one."""
    points = solution.reactions(case=case).points
    _check_names(only, [point.mark for point in points], "mark")
    found = [
        (_share(point.force, sense), point.mark)
        for point in points
        if not only or point.mark in only
    ]
    if not found:
        return Value(value=0.0, case=case), ""
    value, mark = max(found, key=lambda own: _unfavourable(own[0]))
    if value.value == 0.0:
        return replace(value, case=case, place=None), ""
    return replace(value, case=case), mark


def stress_range(
    solution: Solution, of: str, *, cases: Sequence[str] | None = None
) -> Value:
    """Largest change of a stress at a place between cases, and where.

    Parameters
    ----------
    solution : Solution
        A solved plate in its cases or combinations.
    of : str
        "stress xx", "stress yy" or "stress xy" (the same on both faces), or a
        criterion, which has no sign and so does not see a stress reverse.
    cases : sequence of str, optional
        Those between which it changes; all if left out.

    Returns
    -------
    Value
        In Pa, 0 or more; kind "estimate" where balanced moments were found too.

    Raises
    ------
    InputError
        If there is no such stress or case.
    """
    names = solution.cases if cases is None else tuple(cases)
    stresses = _stresses(of)
    for name in names:
        if name not in solution.cases:
            raise InputError(
                f"there is no load case {name!r}; the cases are "
                f"{', '.join(solution.cases)}."
            )
    mesh, samples = solution.mesh, solution.samples
    columns = [solution.cases.index(name) for name in names]
    discs = [disc for disc in solution.excluded if disc.case in ("", *names)]
    kept = outside(samples.points, discs, 1.0)
    places, triangles = samples.points[kept], samples.holders[kept]
    moments = samples.moments[kept][:, :, columns]
    thickness = solution.plate.thicknesses[samples.sections[kept]]
    rims = [rim(mesh, disc) for disc in discs]
    more = np.concatenate([*rims, np.empty((0, 2))])
    more = more[outside(more, discs, 1.0 - 1e-9)]
    parts = [(places, triangles, moments, thickness)]
    if len(more):
        parts.append(_sampled(solution, more, names))
    if not sum(len(part[0]) for part in parts):
        reason = "is not known: the places left out cover the plate"
        return Value(value=math.nan, reason=reason)
    ranges = np.concatenate([_range(stresses(part[2], part[3])) for part in parts])
    holders = np.concatenate([part[1] for part in parts])
    if solution.state.element.conforming:
        close = np.argsort(-ranges, kind="stable")
        close = close[ranges[close] >= (1.0 - _CLOSE) * ranges[close[0]]]
        fine = np.unique(holders[close][:_MOST])
        corners = mesh.points[mesh.triangles[fine]]
        arcs = solution.state.constraints.numbering.arcs.among(fine)
        lattice = arcs.bent(Lattice.of(_FINE).barycentrics, len(fine))
        inner = (lattice @ corners).reshape(-1, 2)
        inner = inner[outside(inner, discs, 1.0)]
        if len(inner):
            parts.append(_sampled(solution, inner, names))
    places, holders, moments, thickness = (
        np.concatenate([part[k] for part in parts]) for k in range(4)
    )
    ranges = _range(stresses(moments, thickness))
    best = int(np.argmax(ranges))
    x, y = places[best].tolist()
    value = Value(value=float(ranges[best]), place=(x, y))
    if solution.dual is None or not solution.state.element.conforming:
        return value
    own = mesh.barycentrics(holders, places)[:, None]
    other = solution.dual.moments_at(holders, own)[:, 0][:, :, columns]
    size = (6.0 / thickness**2)[:, None]
    if of in EVEN:
        doubt = size * EVEN[of](np.moveaxis(moments - other, 1, 2))
    else:
        off = principal_moments(np.moveaxis(moments - other, 1, 2))[0]
        doubt = size * np.abs(off).max(axis=-1)
    band = peak_band(mesh, holders, ranges, 2.0 * doubt.max(axis=1))
    return replace(
        value,
        lower=max(0.0, min(band.lower, value.value)),
        upper=max(band.upper, value.value),
        kind="estimate",
    )


Stresses = Callable[[Floats, Floats], Floats]


def _stresses(of: str) -> Stresses:
    """What makes stresses (k, f, c) of f faces of moments (k, 3, c) and thickness."""
    if of in COMPONENTS:
        component = COMPONENTS.index(of)
        return lambda m, h: (6.0 / h**2)[:, None, None] * m[:, component, None]
    if of in EVEN:
        criterion = EVEN[of]
        return lambda m, h: (
            (6.0 / h**2)[:, None, None] * criterion(np.moveaxis(m, 1, 2))[:, None]
        )
    if of == "largest principal":
        return _principal
    raise InputError(
        f"there is no stress {of!r}; they are "
        f"{', '.join((*COMPONENTS, *EVEN, 'largest principal'))}."
    )


def _principal(moments: Floats, thickness: Floats) -> Floats:
    m, h = np.moveaxis(moments, 1, 2), thickness[:, None]
    faces = [principal_moments(surface_stress(m, h, face))[0][..., 0] for face in FACES]
    return np.stack(faces, axis=1)


def _range(stresses: Floats) -> Floats:
    """Largest change of stresses (k, f, c) over cases on a face, (k,)."""
    change: Floats = np.ptp(stresses, axis=2).max(axis=1)
    return change


def _sampled(
    solution: Solution, places: Floats, names: Sequence[str]
) -> tuple[Floats, Ints, Floats, Floats]:
    """Places with triangles, moments (k, 3, c) and thicknesses there."""
    triangles, _ = solution.mesh.locate(places)
    moments = [solution.moments(places, case=name) for name in names]
    thickness = solution.plate.thicknesses[solution.mesh.zones[triangles]]
    return places, triangles, np.stack(moments, axis=-1), thickness


def _share(force: Value, sense: Sense) -> Value:
    """What of a force, positive up, is of one sense: no less than 0, band and all."""
    own = -force if sense == "hold-down" else force
    if own.lower is None or own.upper is None:
        return replace(own, value=max(own.value, 0.0))
    low, high = max(own.lower, 0.0), max(own.upper, 0.0)
    return replace(own, value=max(own.value, 0.0), lower=low, upper=high)


def _unfavourable(force: Value) -> float:
    return force.value if force.upper is None else force.upper


def _check_names(only: Sequence[str], names: Sequence[str], what: str) -> None:
    for name in only:
        if name not in names:
            raise InputError(
                f"there is no held {what} {name!r}; they are "
                f"{', '.join(names) or 'none'}."
            )
