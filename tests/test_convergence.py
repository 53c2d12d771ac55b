"""Orders of convergence of the elements on unstructured meshes, for made-up states.

A smooth deflection without symmetry is chosen first, the pressure D lap lap w follows.
The error's energy is that of the exact curvatures less the elements' own, integrated
piece by piece; in that norm polynomials of degree k in w leave an error of order k - 1.
"""

from dataclasses import dataclass, replace
from functools import cache

import numpy as np
import pytest
from plates import grid, rectangle

from kplate.loads import Case, PressureField
from kplate.quadrature import composite, triangle_rule
from kplate.solve.static import solve_static
from kplate.supports import CLAMPED, SIMPLY_SUPPORTED, Support

D = 1e4
DIVISIONS = np.array([12, 24, 48])
# The square of the quintic's error, whose leading part is of degree 4, is exact.
DEGREE = 8


@dataclass(frozen=True, kw_only=True)
class Profile:
    """Sum of the imaginary parts of ``c exp(z t)``: a factor of w along one side."""

    terms: tuple[tuple[complex, complex], ...]

    def __call__(self, t, order):
        """Its derivative of an order."""
        parts = (c * z**order * np.exp(z * t) for c, z in self.terms)
        return np.imag(sum(parts))


def clamped(rate):
    """``exp(rate t) sin(pi t)^2``: value and slope vanish at 0 and 1."""
    return Profile(terms=((0.5j, rate), (-0.5j, rate + 2j * np.pi)))


def hinged(share):
    """``sin(pi t) + share sin(2 pi t)``: value and curvature vanish at 0 and 1."""
    return Profile(terms=((1.0, 1j * np.pi), (share, 2j * np.pi)))


@dataclass(frozen=True, kw_only=True)
class MadeUp:
    """A square plate of side 1 with ``w = f(x) g(y)``."""

    support: Support
    f: Profile
    g: Profile

    def derivative(self, x, y, i, j):
        """``d^(i+j) w / dx^i dy^j``."""
        return self.f(x, i) * self.g(y, j)

    def pressure(self, x, y):
        w = self.derivative
        return D * (w(x, y, 4, 0) + 2.0 * w(x, y, 2, 2) + w(x, y, 0, 4))

    def curvature(self, x, y):
        w = self.derivative
        parts = [w(x, y, 2, 0), w(x, y, 0, 2), 2.0 * w(x, y, 1, 1)]
        return np.stack(parts, axis=-1)


STATES = {
    "clamped": MadeUp(support=CLAMPED, f=clamped(1.0), g=clamped(-0.7)),
    "simply supported": MadeUp(support=SIMPLY_SUPPORTED, f=hinged(0.5), g=hinged(-0.3)),
}


@cache
def shaken(n):
    """A grid with its inner points moved by up to a fifth of the spacing each way."""
    mesh, rng = grid(n), np.random.default_rng(5)
    points = mesh.points.copy()
    inner = ((points > 1e-9) & (points < 1.0 - 1e-9)).all(axis=1)
    points[inner] += 0.2 / n * rng.uniform(-1.0, 1.0, (int(inner.sum()), 2))
    return replace(mesh, points=points)


def energy_error(made_up, mesh, element):
    """Square root of the share of the error's energy in the plate's."""
    plate = rectangle(made_up.support, D=D)
    case = Case(name="made up", loads=[PressureField(made_up.pressure)])
    state = solve_static(plate, mesh, [case], element=element)
    rule = composite(state.element.pieces, triangle_rule(DEGREE))
    corners = mesh.points[mesh.triangles]
    exact = made_up.curvature(*np.moveaxis(rule.points @ corners, -1, 0))
    own = state.unknowns[state.constraints.numbering.table, 0]
    found = np.einsum(
        "nqrd,nd->nqr", state.element.curvature(corners, rule.points), own
    )
    energies = [
        np.einsum(
            "nqr,rs,nqs,q,n->", kappa, plate.rigidity, kappa, rule.weights, mesh.areas
        )
        for kappa in (exact - found, exact)
    ]
    return np.sqrt(energies[0] / energies[1])


@pytest.mark.parametrize("name", STATES)
def test_the_made_up_states_meet_their_supports(name):
    made_up = STATES[name]
    t = np.linspace(0.0, 1.0, 7)
    natural = 1 if name == "clamped" else 2
    for end in (0.0, 1.0):
        for order in (0, natural):
            assert np.abs(made_up.derivative(end, t, order, 0)).max() < 1e-13
            assert np.abs(made_up.derivative(t, end, 0, order)).max() < 1e-13
    mirrored = made_up.derivative(1.0 - t, t, 0, 0)
    assert np.abs(made_up.derivative(t, t, 0, 0) - mirrored).max() > 0.2


@pytest.mark.parametrize("name", STATES)
@pytest.mark.parametrize(
    ("element", "order"), [("dkt", 1.0), ("hct", 2.0), ("quintic", 4.0)]
)
def test_the_energy_error_falls_with_the_element_s_order(element, order, name):
    error = [energy_error(STATES[name], shaken(int(n)), element) for n in DIVISIONS]
    found = -np.diff(np.log(error)) / np.diff(np.log(DIVISIONS))
    assert found == pytest.approx([order, order], abs=0.15)
