"""Line reactions of C1 elements, found in the space of their own edge traces.

What a support brings to the discrete plate, the residual r, works on every virtual
deflection v as an effective shear v_n on v, a clamping moment m_nn on the slope v,n,
and a force R at the end of a run of edges on v there:

    r(v) = sum over held edges of (v_n, v) + (m_nn, v,n) + sum over ends of R v.

v_n is sought among the functions that v itself can be along the held edges, which are
Hermite polynomials of jets (values and derivatives along the edge) at the vertices;
m_nn among those that v,n can be. Runs are edges that go on smoothly; where one ends,
the highest jet of v_n is dropped. At plain vertices there are as many unknowns as
equations; where supports meet, the smallest solution is taken. The equations then hold
to round-off, so that the resultants balance the loads.

Signs: n on the right of an edge as it is listed; v_n and R positive up.
"""

from dataclasses import dataclass
from functools import cached_property

import numpy as np
import scipy.sparse as sp

from kplate import hermite
from kplate.arrays import Bools, Floats, Ints
from kplate.boundary import rigid_motions, second_derivative
from kplate.dofs import Numbering
from kplate.elements.triangle import edge_normals
from kplate.heldedges import HeldEdges, held_edges
from kplate.quadrature import gauss
from kplate.solve.static import StaticState

# A force at an end on the rim that no corner carries is used only in need.
RELUCTANCE = 1e-4
# Added to the equations, scaled to one, in case two of them say the same.
SLACK = 1e-13
_POINTS = 12  # of the quadrature along round edges


@dataclass(frozen=True, eq=False, kw_only=True)
class Traces:
    """What supports bring along held edges, in all cases.

    Parameters
    ----------
    numbering : Numbering
        The unknowns.
    held : HeldEdges
        The edges.
    shears : ndarray, shape (m, 2 j, c)
        v_n in N/m and its derivatives by the share of the edge's length, at the
        beginning, then at the end.
    couples : ndarray, shape (m, 2 j - 1, c)
        m_nn in N and such derivatives of it, one fewer, then m_nn halfway.
    unknowns : ndarray, shape (m, d)
        Unknowns at the beginning, at the end and on the edge.
    nodal : ndarray, shape (m, d, c)
        What each edge brings to them.
    vertices : ndarray, shape (k,)
        Vertices with a force of their own.
    forces : ndarray, shape (k, c)
        Those forces R in N.
    left : ndarray, shape (m, 3, c)
        Work on w = 1, x and y of what else each edge brings: where it is round, to
        unknowns that are free.
    """

    numbering: Numbering
    held: HeldEdges
    shears: Floats
    couples: Floats
    unknowns: Ints
    nodal: Floats
    vertices: Ints
    forces: Floats
    left: Floats

    @cached_property
    def motions(self) -> Floats:
        """Unknowns of w = 1, x and y, (count, 3)."""
        return rigid_motions(self.numbering)

    def places(self, edges: Ints, shares: Floats) -> tuple[Floats, Floats]:
        """Places in m at shares (q,) of edges (k,), (k, q, 2), and lengths, (k,)."""
        mesh = self.numbering.mesh
        start, end = np.moveaxis(mesh.points[self.held.edges[edges]], 1, 0)
        places = start[:, None] + shares[:, None] * (end - start)[:, None]
        lengths = np.hypot(*(end - start).T)
        curved = np.flatnonzero(self.held.curvatures[edges])
        if curved.size:
            at = mesh.triangles_at(self.held.edges[edges[curved]])
            arcs = self.numbering.arcs.among(at)
            places[curved], lengths[curved] = arcs.at(shares)[0], arcs.lengths
        return places, lengths

    def brought_to(self, unknown: int) -> Floats:
        """What v_n and m_nn along held edges do to one unknown, (c,)."""
        brought: Floats = self.nodal[self.unknowns == unknown].sum(axis=0)
        return brought

    def line_reaction(self, edges: Ints, shares: Floats) -> Floats:
        """v_n in N/m at shares (q,) of the lengths of edges (k,), (k, q, c)."""
        basis = hermite.basis(self.shears.shape[1] // 2, halfway=False)
        return hermite.values(basis, shares) @ self.shears[edges]

    def line_moment(self, edges: Ints, shares: Floats) -> Floats:
        """m_nn in N at shares (q,) of the lengths of edges (k,), (k, q, c)."""
        basis = hermite.basis(self.couples.shape[1] // 2, halfway=True)
        return hermite.values(basis, shares) @ self.couples[edges]


def solve_traces(state: StaticState, carrying: Ints) -> Traces:
    """Find what the supports bring along held edges.

    Parameters
    ----------
    state : StaticState
        The solved plate, of a C1 element.
    carrying : ndarray, shape (k,)
        Vertices at which a corner force can act.

    Returns
    -------
    Traces
    """
    numbering, mesh = state.constraints.numbering, state.mesh
    held = held_edges(state.plate, mesh, numbering.arcs)
    jets = numbering.per_vertex // 3 + 1  # w along an edge is a cubic or a quintic
    lengths, on_w, on_slope = _virtual(state, held, jets)
    own = numbering.at_vertices(held.edges)
    own = own.reshape(len(own), 2 * numbering.per_vertex)
    on_edge = numbering.on_edges(mesh.edge_numbers(held.edges))
    unknowns = np.concatenate([own, on_edge], axis=1)
    by_length = lengths[:, None, None]
    shear_work = on_w.swapaxes(1, 2) @ (
        by_length * hermite.products(jets, halfway=False)
    )
    couple_work = on_slope.swapaxes(1, 2) @ (
        by_length * hermite.products(jets - 1, halfway=True)
    )
    if held.curvatures.any():
        unknowns, shear_work, couple_work = _round_work(
            state, held, (unknowns, shear_work, couple_work)
        )
    shear_map, couple_map = _maps(held, lengths, jets)
    vertices, sizes = _ends(state, held, lengths, carrying)
    count = shear_map[0].max(initial=-1) + 1
    A = sp.hstack(
        [
            _spread(unknowns, shear_work, shear_map, numbering.count),
            _spread(unknowns, couple_work, couple_map, numbering.count),
            sp.csr_array(
                (
                    sizes,
                    (numbering.at_vertices(vertices)[:, 0], np.arange(len(vertices))),
                ),
                shape=(numbering.count, len(vertices)),
            ),
        ],
        format="csr",
    )
    found = _smallest(state, held, A)
    shears = _gathered(found[:count], shear_map)
    couples = _gathered(found[count : len(found) - len(vertices)], couple_map)
    return Traces(
        numbering=numbering,
        held=held,
        shears=shears,
        couples=couples,
        unknowns=unknowns,
        nodal=shear_work @ shears + couple_work @ couples,
        vertices=vertices,
        forces=sizes[:, None] * found[len(found) - len(vertices) :],
        left=_left(state, held, unknowns, A @ found),
    )


def _round_work(
    state: StaticState, held: HeldEdges, straight: tuple[Ints, Floats, Floats]
) -> tuple[Ints, Floats, Floats]:
    """The same along round edges too: there w is no polynomial of the length.

    It is not that of the edge's own unknowns alone either, so that each edge gets the
    others of its triangle; along straight ones they do no work.
    """
    numbering, mesh = state.constraints.numbering, state.mesh
    unknowns, shear_work, couple_work = straight
    m, count = unknowns.shape
    p, jets = numbering.per_vertex, shear_work.shape[2] // 2
    curved = np.flatnonzero(held.curvatures)
    triangles = mesh.triangles_at(held.edges[curved])
    arcs = numbering.arcs.unheld().among(triangles)
    shares, weights = gauss(_POINTS)
    points = arcs.barycentrics(arcs.at(shares)[0])
    rows = state.element.evaluate(arcs.vertices, points, arcs)
    _, normal = arcs.frames(shares)
    slope = np.einsum("mqc,mqcd->mqd", normal, rows[:, :, 1:])
    found = np.repeat(unknowns[:, :1], 3 * p + 3, axis=1)
    found[:, :count] = unknowns
    found[curved] = numbering.table[triangles]
    works = []
    for work, values, basis in (
        (shear_work, rows[:, :, 0], hermite.basis(jets, halfway=False)),
        (couple_work, slope, hermite.basis(jets - 1, halfway=True)),
    ):
        along = hermite.values(basis, shares) * weights[:, None]
        own = np.zeros((m, 3 * p + 3, work.shape[2]))
        own[:, :count] = work
        own[curved] = arcs.lengths[:, None, None] * (values.swapaxes(1, 2) @ along)
        works.append(own)
    return found, works[0], works[1]


def _left(
    state: StaticState, held: HeldEdges, unknowns: Ints, brought: Floats
) -> Floats:
    """Work on w = 1, x and y of what edges do not bring yet, (m, 3, c).

    It is what free unknowns of the triangles at held round edges get, in even shares of
    the edges that have them. What point supports bring is theirs.
    """
    m, numbering = len(held.edges), state.constraints.numbering
    left = np.zeros((m, 3, brought.shape[1]))
    if not held.curvatures.any():
        return left
    rest = state.support_forces - brought
    marks = np.setdiff1d(state.mesh.mark_vertices, held.edges)
    rest[numbering.at_vertices(marks)[:, 0]] = 0.0
    number = np.repeat(np.arange(m), unknowns.shape[1])
    has = sp.coo_array(
        (np.ones(unknowns.size), (number, unknowns.ravel())),
        shape=(m, numbering.count),
    ).tocsr()
    has.data[:] = 1.0
    shared = np.maximum(has.sum(axis=0), 1.0)
    motions = rigid_motions(numbering)
    for a in range(3):
        own = has @ ((motions[:, a] / shared)[:, None] * rest)
        left[:, a] = np.asarray(own)
    return left


def _virtual(
    state: StaticState, held: HeldEdges, jets: int
) -> tuple[Floats, Floats, Floats]:
    """Lengths, and what unknowns are to w and to the slope along held edges.

    Returns
    -------
    lengths : ndarray, shape (m,)
        In m.
    on_w : ndarray, shape (m, 2 j, d)
        Rows of w and its derivatives by the share of the length, at both ends.
    on_slope : ndarray, shape (m, 2 j - 1, d)
        Rows of the slope along the normal and of such derivatives, one fewer, at both
        ends; then that halfway.
    """
    mesh, p = state.mesh, state.constraints.numbering.per_vertex
    m = len(held.edges)
    step = mesh.points[held.edges[:, 1]] - mesh.points[held.edges[:, 0]]
    lengths = np.hypot(*step.T)
    tangent = step / lengths[:, None]
    normal = np.column_stack([tangent[:, 1], -tangent[:, 0]])
    bow = held.curvatures
    curved = bow != 0.0
    half = np.arcsin(0.5 * lengths[curved] * np.abs(bow[curved]))
    lengths[curved] = 2.0 * half / np.abs(bow[curved])
    on_w = np.zeros((m, 2 * jets, 2 * p + 1))
    on_slope = np.zeros((m, 2 * jets - 1, 2 * p + 1))
    for end in (0, 1):
        along = held.tangents[:, end] * lengths[:, None]
        across = np.column_stack([held.tangents[:, end, 1], -held.tangents[:, end, 0]])
        w = on_w[:, jets * end : jets * (end + 1), p * end : p * (end + 1)]
        w[:, 0, 0] = 1.0
        w[:, 1, 1:3] = along
        first = (jets - 1) * end
        slope = on_slope[:, first : first + jets - 1, p * end : p * (end + 1)]
        slope[:, 0, 1:3] = across
        if jets == 3:
            w[:, 2, 3:] = second_derivative(along, along)
            slope[:, 1, 3:] = second_derivative(along, across)
            # Along an arc the tangent turns to the inside, the normal to the tangent.
            w[:, 2, 1:3] -= across * (bow * lengths**2)[:, None]
            slope[:, 1, 1:3] += along * bow[:, None]
    triangles = mesh.triangles_at(held.edges)
    corners = mesh.triangles[triangles]
    on = (corners[:, :, None] == held.edges[:, None]).any(axis=2)
    own = edge_normals(mesh.points[corners])[np.arange(m), np.argmin(on, axis=1)]
    on_slope[:, -1, -1] = np.sign(np.einsum("mc,mc->m", own, normal))
    return lengths, on_w, on_slope


_Map = tuple[Ints, Floats]


def _maps(held: HeldEdges, lengths: Floats, jets: int) -> tuple[_Map, _Map]:
    """Columns of the jets of v_n and m_nn on each edge, -1 for none, and factors."""
    size = np.zeros(int(held.joints.max(initial=0)) + 1)
    np.maximum.at(size, held.joints, lengths[:, None])
    ratio = lengths[:, None] / size[held.joints] * held.senses  # (m, 2)
    order = np.arange(jets)
    factors = ratio[:, :, None] ** order
    kept = np.broadcast_to(held.holds[:, None, None], factors.shape)
    kept = kept & ~(held.ends[:, :, None] & (order == jets - 1))
    shears = _numbered(held.joints[:, :, None] * jets + order, kept)
    order = np.arange(jets - 1)
    turned = ratio[:, :, None] ** order * held.senses[:, :, None]
    turned = turned * size[held.joints][:, :, None]
    kept = np.broadcast_to(held.clamps[:, None, None], turned.shape)
    m = len(lengths)
    keys = held.joints[:, :, None] * (jets - 1) + order
    halfway = keys.max(initial=0) + 1 + np.arange(m)
    couples = _numbered(
        np.concatenate([keys.reshape(m, -1), halfway[:, None]], axis=1),
        np.concatenate([kept.reshape(m, -1), held.clamps[:, None]], axis=1),
    )
    turned = np.concatenate([turned.reshape(m, -1), lengths[:, None]], axis=1)
    return (shears.reshape(m, -1), factors.reshape(m, -1)), (couples, turned)


def _numbered(keys: Ints, kept: Bools) -> Ints:
    """Numbers from 0 for the different keys that are kept, -1 for the others."""
    result = np.full(keys.shape, -1)
    result[kept] = np.unique(keys[kept], return_inverse=True)[1]
    return result


def _ends(
    state: StaticState, held: HeldEdges, lengths: Floats, carrying: Ints
) -> tuple[Ints, Floats]:
    """Vertices that may have a force of their own, and the size of its unit.

    They are the ends of runs and the marks along them. On the rim, at a corner that
    carries no force, it has a small unit, lest it take what belongs to the lines.
    """
    ends = held.edges[held.ends & held.holds[:, None]]
    marks = np.intersect1d(state.mesh.mark_vertices, held.edges)
    vertices = np.union1d(ends, marks)
    size = np.zeros(len(state.mesh.points))
    np.maximum.at(size, held.edges, lengths[:, None])
    inside = ~np.isin(vertices, state.mesh.boundary_edges)
    share = np.where(inside | np.isin(vertices, carrying), 1.0, RELUCTANCE)
    return vertices, size[vertices] * share


def _spread(unknowns: Ints, work: Floats, place: _Map, count: int) -> sp.csr_array:
    """Matrix (count, columns) of what the columns bring to the unknowns."""
    columns, factors = place
    some = columns >= 0
    edge, jet = np.nonzero(some)
    values = work[edge, :, jet] * factors[some][:, None]
    rows = unknowns[edge]
    across = np.broadcast_to(columns[some][:, None], rows.shape)
    shape = (count, int(columns.max(initial=-1)) + 1)
    return sp.coo_array(
        (values.ravel(), (rows.ravel(), across.ravel())), shape=shape
    ).tocsr()


def _gathered(found: Floats, place: _Map) -> Floats:
    """Jets on each edge (m, j, c) from the columns' values."""
    columns, factors = place
    values = np.concatenate([found, np.zeros((1, found.shape[1]))])  # -1: none
    return values[columns] * factors[..., None]


def _smallest(state: StaticState, held: HeldEdges, A: sp.csr_array) -> Floats:
    """Smallest x with A x equal to the residual in all held directions."""
    from scipy.sparse.linalg import splu

    B = _held_directions(state, held)
    right = B @ state.support_forces
    E = (B @ A).tocsr()
    size = np.maximum(abs(E).max(axis=1).toarray().ravel(), np.finfo(float).tiny)
    E, right = (sp.diags_array(1.0 / size) @ E).tocsr(), right / size[:, None]
    n, k = E.shape[1], E.shape[0]
    whole = sp.block_array(
        [[sp.eye_array(n), E.T], [E, -SLACK * sp.eye_array(k)]], format="csc"
    )
    factor = splu(whole)
    x = np.zeros((n, right.shape[1]))
    for _ in range(3):
        rest = np.concatenate([np.zeros_like(x), right - E @ x])
        x += factor.solve(rest)[:n]
    return x


def _held_directions(state: StaticState, held: HeldEdges) -> sp.csr_array:
    """Rows: directions held at vertices of held edges, and held unknowns of edges."""
    constraints, numbering = state.constraints, state.constraints.numbering
    own = np.isin(constraints.vertices, held.edges)
    frames, fixed = constraints.frames[own], constraints.held[own]
    at, which = np.nonzero(fixed)
    columns = numbering.at_vertices(constraints.vertices[own])[at]
    values = frames[at, :, which]
    rows = np.broadcast_to(np.arange(len(at))[:, None], columns.shape)
    vertices = sp.coo_array(
        (values.ravel(), (rows.ravel(), columns.ravel())),
        shape=(len(at), numbering.count),
    )
    # Along arcs w,tt does work, though it is free where the slope across is.
    free = (held.curvatures != 0.0) & ~held.clamps & (numbering.per_vertex > 3)
    round_edges = np.flatnonzero(free)
    ends = held.edges[round_edges]
    bent, first = np.unique(ends, return_index=True)
    tangents = held.tangents[round_edges].reshape(-1, 2)[first]
    columns = numbering.at_vertices(bent)[:, 3:]
    along = np.column_stack(
        [tangents[:, 0] ** 2, tangents[:, 0] * tangents[:, 1], tangents[:, 1] ** 2]
    )
    rows = np.broadcast_to(np.arange(len(bent))[:, None], columns.shape)
    bows = sp.coo_array(
        (along.ravel(), (rows.ravel(), columns.ravel())),
        shape=(len(bent), numbering.count),
    )
    m = len(constraints.on_edges)
    edges = sp.coo_array(
        (np.ones(m), (np.arange(m), constraints.on_edges)), shape=(m, numbering.count)
    )
    return sp.vstack([vertices, bows, edges], format="csr")
