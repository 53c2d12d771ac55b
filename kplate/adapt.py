"""From a stated plate and its loads to a solution: mesh, solve, keep.

The mesh has one size, given as a number of triangles or a length, and is finer around
the places that have no finite moment; bands are not estimated.
"""

import math
from collections.abc import Callable, Sequence
from dataclasses import replace
from functools import partial

from kplate.certifying import BUDGET, refine_to
from kplate.choice import AUTO, TRIANGLES, choose
from kplate.coarser import MESHES
from kplate.combinations import Combination, expanded
from kplate.combining import combined
from kplate.elements import ELEMENTS
from kplate.errors import InputError, MeshError, SolveError
from kplate.following import followed
from kplate.goals import Deflection, Goal, Peak, Place, Resultant
from kplate.guard import mesh_guarded
from kplate.loads import Case, DiscPatch, Load, PointMoment, RectanglePatch
from kplate.mesh import Mesh
from kplate.meshing import mesh_outline, refined_triangles, size_for
from kplate.outline import Outline
from kplate.plate import Plate
from kplate.refine import refined_towards
from kplate.roundedges import fitted
from kplate.singular import excluded_places, plate_corners
from kplate.solution import Solution
from kplate.solve.dual import solve_dual
from kplate.solve.static import Progress, solve_static

# Edges at a place without a finite moment, as a share of the disc that is left out, so
# that the rim of the disc, which is judged, lies several triangles from its centre: at
# 0.25 the stress there comes out 5 % high, at 0.125 it stays within 0.2 % from 5,000 to
# 80,000 triangles.
RIM_SHARE = 0.125
# Error wanted from the very point of an unbounded corner; no edge is shorter than this
# share of the span, below which round-off would spoil the equations.
CORNER_ERROR, LEAST_SHARE = 1e-3, 1e-6
# The same for corners where only the shear is unbounded: it costs few triangles there.
SHEAR_ERROR = 1e-6
ENOUGH, MOST = 2_500, 100_000  # triangles at a refined place, at all of them
# Edges at the centre of a patch, as a share of its smaller length.
PATCH_SHARE = 0.125
# The first mesh on the way to a tolerance: triangles, and edges at excluded discs as a
# share of their radius, half of it below a tolerance.
COARSE = {"quintic": 120, "hct": 600}
RIMS = {"quintic": 1.0, "hct": 0.4}
FINE_TOLERANCE = 0.005
# Of places of peaks that are nearer to each other than this share of the span, one gets
# a vertex: the deflection is flat there, and slim triangles spoil a mesh.
APART = 0.02
# Least number of edges on a full circle that an element follows: on a mesh of one size,
# and on the first one on the way to a tolerance.
AROUND, COARSE_AROUND = {"quintic": 32}, {"quintic": 12}
MOST_AROUND = 400  # a rim that needs more is nearer to another than is sensible


def solve(
    plate: Plate,
    loads: Sequence[Load | Case],
    *,
    triangles: int | None = None,
    size: float | None = None,
    element: str = AUTO,
    excluded_radius: float | None = None,
    balanced: bool = False,
    tolerance: float | None = None,
    goals: Sequence[Goal] | None = None,
    combinations: Sequence[Combination] = (),
    budget: int = BUDGET,
    progress: Progress | None = None,
) -> Solution:
    """Solve the bending of a plate under its loads.

    Parameters
    ----------
    plate : Plate
        The statement.
    loads : sequence of loads or of Case
        Loads that act together, or cases of them, each solved for itself.
    triangles : int, optional
        About how many triangles to use; if neither this nor `size` is given, as many
        as suit the element (`kplate.choice.TRIANGLES`).
    size : float, optional
        Length of the triangles' edges in m, instead.
    element : str, optional
        "quintic", "hct" or "dkt"; "auto" takes the one that suits the plate
        (`kplate.choice`).
    excluded_radius : float, optional
        Radius in m of the discs left out of the peaks around places without a finite
        moment; the plate's thickness if left out.
    balanced : bool, optional
        Whether to find balanced moments too (`Solution.balanced_moments`), on the same
        mesh; they take several times as long.
    tolerance : float, optional
        Half width of the bands as a share of the values, such as 0.01: the mesh is
        refined until every goal is inside it. Without one a single mesh is solved and
        no band is made; with DKT, too, whose deflections, stresses and reactions then
        carry an indicator, which takes a third more time.
    goals : sequence of Goal, optional
        What must be inside the tolerance, in every case; the peak deflection, the peak
        von Mises stress and the resultant of each support if left out.
    combinations : sequence of Combination, optional
        What must be inside the tolerance instead of the cases; the solution is still
        that of the cases (`kplate.combining.combine` makes one of combinations).
    budget : int, optional
        Unknowns beyond which no finer mesh is made; the bands are then those reached.
    progress : callable, optional
        Called with a stage and the fraction done.

    Returns
    -------
    Solution

    Raises
    ------
    InputError
        If loads and cases are mixed, there are none, both `triangles` and `size` are
        given or one of them or `excluded_radius` is out of range, the element does not
        suit the plate, or a load does not fit it.
    MeshError
        If the outline cannot be meshed.
    SolveError
        If the plate can still move as a rigid body.

    Examples
    --------
    A clamped disc deflects p a^4 / 64 D at its centre (Timoshenko and
    Woinowsky-Krieger, 1959, eq. 62, from memory):

    >>> from kplate.materials import STEEL
    >>> from kplate.outline import Outline
    >>> from kplate.supports import CLAMPED
    >>> from kplate.loads import Pressure
    >>> disc = Plate(
    ...     outline=Outline.circle((0.0, 0.0), radius=0.5),
    ...     thickness=0.01,
    ...     material=STEEL,
    ...     supports={"rim": CLAMPED},
    ... )
    >>> solution = solve(disc, [Pressure(-10e3)], triangles=4000)
    >>> exact = -10e3 * 0.5**4 / (64 * STEEL.bending_stiffness(0.01))
    >>> bool(abs(solution.peak("deflection").value / exact - 1) < 0.005)
    True
    """
    if triangles is not None and size is not None:
        raise InputError("give the number of triangles or their size, not both.")
    if tolerance is not None and not 0.0 < tolerance < 1.0:
        raise InputError(
            f"the tolerance is {tolerance:g}; it must lie between 0 and 1."
        )
    if excluded_radius is not None and not excluded_radius > 0.0:
        raise InputError(
            f"excluded_radius is {excluded_radius:g} m; it must be positive."
        )
    if size is not None and not (math.isfinite(size) and size > 0.0):
        raise InputError(f"the mesh size is {size:g} m; it must be a positive number.")
    cases = _as_cases(loads)
    judged = expanded(cases, combinations)
    if size is not None:
        triangles = math.ceil(plate.outline.area / (math.sqrt(3.0) / 4.0 * size**2))
    chosen = choose(plate, element, triangles)
    if tolerance is not None and not no_bands(cases, chosen.element):
        return _to_tolerance(
            plate,
            cases,
            tolerance,
            goals=default_goals(plate) if goals is None else goals,
            element=chosen.element,
            combinations=judged,
            start=size,
            budget=budget,
            excluded_radius=excluded_radius,
            progress=progress,
        )
    if size is None:
        wanted = TRIANGLES[chosen.element] if triangles is None else triangles
        size = size_for(plate.outline, wanted)
    if progress is not None:
        progress("mesh", 0.0)
    mesh = _single_mesh(plate, cases, size, excluded_radius, chosen.element)
    state = solve_static(plate, mesh, cases, element=chosen.element, progress=progress)
    arcs = state.constraints.numbering.arcs
    dual = solve_dual(plate, mesh, cases, arcs=arcs) if balanced else None
    solution = Solution(
        state=state, excluded_radius=excluded_radius, dual=dual, tolerance=tolerance
    )
    if tolerance is None or state.element.conforming:
        return solution
    return replace(solution, coarser=_coarser(solution, size))


def _single_mesh(
    plate: Plate,
    cases: Sequence[Case],
    size: float,
    excluded_radius: float | None,
    element: str,
) -> Mesh:
    """A mesh of one size, finer where moments are not finite."""
    mesher = partial(
        _mesher(plate.outline),
        plate.outline,
        size=size,
        fine=_fine(plate, cases, size, excluded_radius),
        graded=corner_grading(plate),
    )
    return _fitting(mesher, AROUND.get(element), element)


def _mesher(outline: Outline) -> Callable[..., Mesh]:
    inside = outline.zones or outline.seams or outline.marks
    return mesh_guarded if inside else mesh_outline


def _fitting(mesher: Callable[..., Mesh], around: int | None, element: str) -> Mesh:
    """A mesh whose triangles have room for their round edges.

    Between a round rim and another that is near it they have it only where they are
    small: the rims then get twice as many edges, and so on.
    """
    shape = ELEMENTS[element].shape
    while True:
        mesh = mesher(around=around)
        try:
            return fitted(mesh, shape)
        except MeshError:
            if around is None or around > MOST_AROUND:
                raise
            around *= 2


def _coarser(solution: Solution, size: float) -> tuple[Solution, ...]:
    """The same on the coarser meshes of an indicator; nothing where they fail."""
    plate, cases = solution.plate, solution.state.cases
    radius, found = solution.excluded_radius, []
    for times in MESHES:
        try:
            mesh = _single_mesh(plate, cases, times * size, radius, "dkt")
            state = solve_static(plate, mesh, cases, element="dkt")
        except (MeshError, SolveError):
            return ()
        found.append(Solution(state=state, excluded_radius=radius))
    return tuple(found)


def no_bands(cases: Sequence[Case], element: str) -> str:
    """Why no bands can be made; empty where they can."""
    if not ELEMENTS[element].conforming:
        return f"a {ELEMENTS[element].name} is not C1"
    for case in cases:
        for load in case.loads:
            if isinstance(load, PointMoment):
                return (
                    f"the moments of the couple at a point in case {case.name} have no "
                    "finite energy"
                )
    return ""


def default_goals(plate: Plate, *criteria: str) -> tuple[Goal, ...]:
    """Goals where nobody states any.

    Peak deflection, peak stress by each criterion (von Mises if none is given), and
    the force of each support.
    """
    outline = plate.outline
    names = [
        *outline.side_names,
        *(seam.name for seam in outline.seams),
        *(mark.name for mark in outline.marks),
    ]
    return (
        Peak(quantity="deflection"),
        *(Peak(quantity=own) for own in criteria or ("von Mises",)),
        *(Resultant(of=n) for n in names if plate.support(n).holds_deflection),
    )


def _to_tolerance(
    plate: Plate,
    cases: Sequence[Case],
    tolerance: float,
    *,
    goals: Sequence[Goal],
    element: str,
    combinations: Sequence[Combination],
    start: float | None,
    budget: int,
    excluded_radius: float | None,
    progress: Progress | None,
) -> Solution:
    """Solve to a tolerance, from a coarse mesh that is graded beforehand."""
    size = size_for(plate.outline, COARSE[element]) if start is None else start
    share = RIMS[element] if tolerance > FINE_TOLERANCE else 0.5 * RIMS[element]
    stressed = any(isinstance(g, Peak) and g.quantity != "deflection" for g in goals)
    discs = excluded_places(plate, cases, excluded_radius) if stressed else ()
    graded = corner_grading(plate, error=tolerance)

    def mesh_for(wanted: Sequence[Goal]) -> Mesh:
        outline = followed(plate.outline, cases, wanted)
        mesher = partial(_mesher(outline), outline, size=size)
        mesh = _fitting(mesher, COARSE_AROUND.get(element), element)
        # Discs from twice the radius on: their rims then lie among small triangles.
        finer = refined_towards(
            mesh,
            [
                *((place, least, 0.0) for place, least in graded),
                *((d.place, share * d.radius, 2.0 * d.radius) for d in discs),
            ],
        )
        return fitted(finer, ELEMENTS[element].shape)

    mesh = mesh_for(goals)
    if Peak(quantity="deflection") in goals:
        # A vertex where it peaks, so that the deflection there can have a bound.
        first = Solution(state=solve_static(plate, mesh, cases, element=element))
        if combinations:
            first = combined(first, combinations)
        tops = [first.peak("deflection", case=name) for name in first.cases]
        places = [top.place for top in tops if top.place is not None and top.value]
        apart = _apart(places, APART * plate.outline.span)
        goals = [*goals, *(Deflection(at=at) for at in apart)]
        mesh = mesh_for(goals)
    return refine_to(
        plate,
        mesh,
        cases,
        goals,
        tolerance=tolerance,
        element=element,
        combinations=combinations,
        budget=budget,
        excluded_radius=excluded_radius,
        progress=progress,
    )


def _apart(places: Sequence[Place], least: float) -> list[Place]:
    """Places without those that are nearer than so much to one before them."""
    kept: list[Place] = []
    for place in places:
        if all(math.dist(place, other) >= least for other in kept):
            kept.append(place)
    return kept


def _fine(
    plate: Plate, cases: Sequence[Case], size: float, radius: float | None
) -> list[tuple[tuple[float, float], float]]:
    """Places to refine, with the length of the edges there in m.

    They are those without a finite moment, and patches. Each may take as many triangles
    more as its share of the plate's area has, or `ENOUGH` while all keep to `MOST`.
    """
    wanted = [
        (place.place, RIM_SHARE * place.radius)
        for place in excluded_places(plate, cases, radius)
    ]
    for case in cases:
        for load in case.loads:
            if isinstance(load, RectanglePatch):
                wanted.append((load.centre, PATCH_SHARE * min(load.size)))
            elif isinstance(load, DiscPatch):
                wanted.append((load.centre, 2.0 * PATCH_SHARE * load.radius))
    n = max(len(wanted), 1)
    share = 4.0 / math.sqrt(3.0) * plate.outline.area / (size**2 * n)
    most = max(share, min(ENOUGH, MOST / n))
    return [(place, _allowed(least, size, most)) for place, least in wanted]


def corner_grading(
    plate: Plate, error: float = CORNER_ERROR
) -> list[tuple[tuple[float, float], float]]:
    """Corners with unbounded shear, with the length of the edges there in m.

    The error of the deflection goes with (h/L)^(2 lambda): on a rhombus of 30 degrees
    this grading takes it from 4.4 % to 0.2 %, on a 12-gon from 15 % to 0.7 %.
    """
    found = []
    for corner in plate_corners(plate):
        if corner.unbounded or corner.shear_unbounded:
            wanted = error if corner.unbounded else min(error, SHEAR_ERROR)
            share = wanted ** (0.5 / corner.exponent.real)
            least = max(share, LEAST_SHARE) * plate.outline.span
            found.append((corner.place, least))
    return found


def _allowed(least: float, size: float, most: float) -> float:
    """The least size, or a larger one that needs no more triangles than `most`."""
    while least < size and refined_triangles(size / least) > most:
        least *= 1.25
    return least


def _as_cases(loads: Sequence[Load | Case]) -> tuple[Case, ...]:
    """Cases as given, or all loads as one case."""
    cases = [item for item in loads if isinstance(item, Case)]
    if not cases:
        alone = [item for item in loads if not isinstance(item, Case)]
        return (Case(name="load", loads=alone),)
    if len(cases) != len(loads):
        raise InputError(
            f"{len(cases)} of {len(loads)} loads are cases; give loads that act "
            "together, or cases, not both."
        )
    return tuple(cases)
