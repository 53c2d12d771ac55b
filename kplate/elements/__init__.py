"""The table of elements.

An element knows triangles and rigidities, and nothing of meshes, plates or supports. A
new one is one file and one line here, and must pass the contract tests.
"""

from collections.abc import Callable
from dataclasses import dataclass

from kplate.arrays import Floats
from kplate.elements import dkt, hct
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
        Unknowns at each vertex (w and its derivatives first) and on each edge.
    degree : int
        Polynomials up to this degree are in its space on any mesh.
    conforming : bool
        Whether w is C1, so that its energy is a bound.
    rule, load_rule : Rule
        Quadrature of the stiffness and of loads.
    pieces : ndarray, shape (s, 3, 3)
        Barycentric vertices of the pieces on which w is one polynomial.
    stiffness : callable
        (geometry with `rule`, rigidity (n, q, 3, 3)) to (n, d, d).
    load : callable
        (geometry with `load_rule`, pressure (n, q)) to (n, d).
    evaluate : callable
        (vertices, barycentrics (n, q, 3)) to the rows of w and slopes (n, q, 3, d).
    curvature : callable
        (vertices, barycentrics (q, 3) or (n, q, 3)) to (n, q, 3, d).
    """

    name: str
    per_vertex: int
    per_edge: int
    degree: int
    conforming: bool
    rule: Rule
    load_rule: Rule
    pieces: Floats
    stiffness: Callable[[Geometry, Floats], Floats]
    load: Callable[[Geometry, Floats], Floats]
    evaluate: Callable[[Floats, Floats], Floats]
    curvature: Callable[[Floats, Floats], Floats]


ELEMENTS = {
    "dkt": Element(
        name="discrete Kirchhoff triangle",
        per_vertex=3,
        per_edge=0,
        degree=2,
        conforming=False,
        rule=dkt.RULE,
        load_rule=hct.LOAD_RULE,
        pieces=hct.PIECES,
        stiffness=dkt.stiffness,
        load=hct.load,
        evaluate=hct.evaluate,
        curvature=dkt.curvature,
    ),
}
