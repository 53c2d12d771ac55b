"""The table of elements.

An element knows triangles and rigidities, and nothing of meshes, plates or supports. A
new one is one file and one line here, and must pass the contract tests.
"""

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

from kplate.arrays import Floats
from kplate.elements import dkt, hct, quintic
from kplate.elements.arcs import Arcs
from kplate.elements.piecewise import Piecewise
from kplate.elements.triangle import Geometry
from kplate.quadrature import Rule


@dataclass(frozen=True, eq=False, kw_only=True)
class Element:
    """What the rest of the package needs to know of an element.

    Parameters
    ----------
    name : str
        Its name in words.
    per_vertex, per_edge : int
        Unknowns at each vertex (w and its slopes, then ``w,xx, w,xy, w,yy``) and on
        each edge (the slope at its middle along `triangle.edge_normals`).
    degree : int
        Polynomials up to this degree are in its space on any mesh.
    curvature_degree : int
        Degree of the curvatures on each piece.
    conforming : bool
        Whether w is C1, so that its energy is a bound.
    rule, load_rule : Rule
        Quadrature of the stiffness; of loads, mass and geometric stiffness.
    pieces : ndarray, shape (s, 3, 3)
        Barycentric vertices of the pieces on which w is one polynomial.
    shape : Piecewise
        Its deflection; of an element that is not conforming, that between the vertices.
    stiffness : callable
        (geometry with `rule`, rigidity (n, q, 3, 3)) to (n, d, d).
    load : callable
        (geometry with `load_rule`, pressure (n, q)) to (n, d).
    mass : callable
        (geometry with `load_rule`, mass per area (n, q)) to (n, d, d).
    geometric : callable
        (geometry with `load_rule`, in-plane forces (n, q, 3)) to (n, d, d).
    evaluate : callable
        (vertices, barycentrics (q, 3) or (n, q, 3), round edges if any) to the rows of
        w and slopes (n, q, 3, d).
    round_rule : callable
        Round edges to the quadrature of their triangles: barycentrics (m, q, 3),
        weights (m, q) in m2.
    arc_loads : callable
        (round edges, line force (m,), edge moment (m,)) to (m, d).
    curvature : callable
        (vertices, barycentrics (q, 3) or (n, q, 3), round edges if any) to
        (n, q, 3, d).
    third_derivatives : callable
        The same to the derivatives of the curvatures by x and y, (n, q, 2, 3, d); of
        those of the deflection where the element is not conforming.
    """

    name: str
    per_vertex: int
    per_edge: int
    degree: int
    curvature_degree: int
    conforming: bool
    rule: Rule
    load_rule: Rule
    pieces: Floats
    shape: Piecewise
    stiffness: Callable[[Geometry, Floats], Floats]
    load: Callable[[Geometry, Floats], Floats]
    mass: Callable[[Geometry, Floats], Floats]
    geometric: Callable[[Geometry, Floats], Floats]
    evaluate: Callable[..., Floats]
    round_rule: Callable[[Arcs], tuple[Floats, Floats]]
    arc_loads: Callable[[Arcs, Floats, Floats], Floats]
    curvature: Callable[..., Floats]
    third_derivatives: Callable[[Floats, Floats], Floats]


def _conforming(shape: Piecewise, **named: Any) -> Element:
    """An element of C1 polynomials, all of whose parts follow from them."""
    return Element(
        degree=shape.degree,
        curvature_degree=shape.degree - 2,
        conforming=True,
        rule=shape.rule,
        load_rule=shape.load_rule,
        pieces=shape.pieces,
        shape=shape,
        stiffness=shape.stiffness,
        load=shape.load,
        mass=shape.mass,
        geometric=shape.geometric,
        evaluate=shape.evaluate,
        round_rule=shape.round_rule,
        arc_loads=shape.arc_loads,
        curvature=shape.curvature,
        third_derivatives=shape.third_derivatives,
        **named,
    )


ELEMENTS = {
    "dkt": Element(
        name="discrete Kirchhoff triangle",
        per_vertex=3,
        per_edge=0,
        degree=2,
        curvature_degree=1,
        conforming=False,
        rule=dkt.RULE,
        load_rule=hct.REDUCED.load_rule,
        pieces=hct.PIECES,
        shape=hct.REDUCED,
        stiffness=dkt.stiffness,
        load=hct.reduced_load,
        mass=hct.REDUCED.mass,
        geometric=hct.REDUCED.geometric,
        evaluate=hct.REDUCED.evaluate,
        round_rule=hct.REDUCED.round_rule,
        arc_loads=hct.REDUCED.arc_loads,
        curvature=dkt.curvature,
        third_derivatives=hct.REDUCED.third_derivatives,
    ),
    "hct": _conforming(
        hct.HCT, name="Hsieh-Clough-Tocher triangle", per_vertex=3, per_edge=1
    ),
    "quintic": _conforming(
        quintic.QUINTIC, name="C1 quintic triangle of Argyris", per_vertex=6, per_edge=1
    ),
}
