"""Mean-value kernels on a mesh: quadrature, and loads on the plate and its dual.

A kernel's disc cuts some triangles. On each of them its weights are sampled on a rule
that is refined until the triangles' parts are small beside the disc; what the rule gets
wrong of quadratics, found against one in polar coordinates, widens the band.
"""

import math
from dataclasses import dataclass

import numpy as np

from kplate import assembly
from kplate.arrays import Floats, Ints
from kplate.dofs import add_up
from kplate.elements import bernstein
from kplate.kernels import Kernel
from kplate.mesh import Mesh
from kplate.quadrature import composite, gauss, triangle_rule
from kplate.samples import Lattice
from kplate.solve.dual import DualSystem
from kplate.solve.static import StaticState, StaticSystem

# Edges in a kernel are parted until they are this share of its radius, or of the width
# of its ring.
FINE, MOST_HALVINGS = 1.0 / 3.0, 4
RULE = triangle_rule(15)
# A narrow ring cuts many large triangles; what few samples get wrong is in the band.
MOST_SAMPLES = 300_000
# Angles of the rule in polar coordinates; a ring's weights have a pole close by.
DISC, RING = 96, 512


@dataclass(frozen=True, eq=False, kw_only=True)
class Kernelled:
    """A kernel on the triangles its disc cuts.

    Parameters
    ----------
    triangles : ndarray, shape (k,)
        Those.
    points, weights : ndarray, shape (q, 3), (q,)
        Quadrature on each.
    moments : ndarray, shape (k, q, 3)
        Weights on the moments there.
    projected : ndarray, shape (k, o, 3)
        Ordinates of their projection on what the dual's moments can be.
    pressure : ndarray, shape (k, q)
        Weights on w.
    error : float
        Error of the quadrature, for moments or deflections of the size of one.
    """

    triangles: Ints
    points: Floats
    weights: Floats
    moments: Floats
    pressure: Floats
    projected: Floats
    error: float


def kernelled_on(mesh: Mesh, kernel: Kernel, order: int) -> Kernelled:
    """A kernel on the triangles its disc cuts, with quadrature that is fine enough."""
    corners = mesh.points[mesh.triangles]
    reach = np.hypot(*np.moveaxis(corners.mean(axis=1) - kernel.centre, -1, 0))
    sides = corners - np.roll(corners, 1, axis=1)
    longest = np.hypot(sides[..., 0], sides[..., 1]).max(axis=1)
    near = np.flatnonzero(
        (reach < kernel.radius + longest) & (reach > kernel.inner - longest)
    )
    size = float(longest[near].max()) / (FINE * (kernel.radius - kernel.inner))
    most = MOST_SAMPLES / (len(near) * len(RULE.weights))
    most = min(MOST_HALVINGS, math.floor(0.5 * math.log2(max(most, 1.0))))
    halvings = min(math.ceil(math.log2(max(size, 1.0))), most)
    lattice = Lattice.of(2**halvings)
    rule = composite(lattice.barycentrics[lattice.triangles], RULE)
    places = rule.points @ corners[near]
    flat = places.reshape(-1, 2)
    moments = np.zeros((*places.shape[:2], 3))
    pressure = np.zeros(places.shape[:2])
    if kernel.moments is not None:
        moments = kernel.moments(flat).reshape(moments.shape)
    if kernel.pressure is not None:
        pressure = kernel.pressure(flat).reshape(pressure.shape)
    used = (moments != 0.0).any(axis=(1, 2)) | (pressure != 0.0).any(axis=1)
    near, moments, pressure = near[used], moments[used], pressure[used]
    shape = bernstein.values(order, rule.points)
    mean = np.einsum("q,qo,kqa->koa", rule.weights, shape, moments, optimize=True)
    projected = np.linalg.solve(bernstein.masses(order), mean)
    weights = mesh.areas[near][:, None] * rule.weights
    return Kernelled(
        triangles=near,
        points=rule.points,
        weights=rule.weights,
        moments=moments,
        pressure=pressure,
        projected=projected,
        error=_quadrature_error(kernel, places[used], weights, (moments, pressure)),
    )


def _quadrature_error(
    kernel: Kernel, places: Floats, weights: Floats, values: tuple[Floats, Floats]
) -> float:
    """Error of a kernel's quadrature on quadratics, for moments of the size of one.

    Against a rule in polar coordinates about the centre, with a factor of two.
    """
    x, y = np.moveaxis((places - kernel.centre) / kernel.radius, -1, 0)
    polar, polar_weights = _polar(kernel)
    s, t = ((polar - kernel.centre) / kernel.radius).T
    total = 0.0
    for given, function in zip(
        (values[0], values[1][..., None]),
        (kernel.moments, kernel.pressure),
        strict=True,
    ):
        if function is None:
            continue
        exact = function(polar).reshape(len(polar), -1)
        for i, j in ((0, 0), (1, 0), (0, 1), (2, 0), (1, 1), (0, 2)):
            found = np.einsum("kq,kqa->a", weights * x**i * y**j, given)
            wanted = (polar_weights * s**i * t**j) @ exact
            total += float(np.abs(found - wanted).sum())
    return 2.0 * total


def _polar(kernel: Kernel) -> tuple[Floats, Floats]:
    """Points and weights of a fine rule on the kernel's disc, half disc or ring."""
    r, radial = gauss(40)
    width, count = kernel.radius - kernel.inner, RING if kernel.degree is None else DISC
    if kernel.inward is not None:
        share, around = gauss(60)
        first = np.arctan2(kernel.inward[1], kernel.inward[0]) - 0.5 * np.pi
        angle, around = first + np.pi * share, np.pi * around
    else:
        angle = 2.0 * np.pi * np.arange(count) / count
        around = np.full(count, 2.0 * np.pi / count)
    R, A = np.meshgrid(kernel.inner + width * r, angle, indexing="ij")
    points = kernel.centre + np.stack([R * np.cos(A), R * np.sin(A)], axis=-1)
    weights = np.outer(radial * width, around) * R
    return points.reshape(-1, 2), weights.ravel()


def kernel_error(state: StaticState, own: Kernelled, case: int) -> float:
    """What the error of a kernel's quadrature can make of a case's moments or w."""
    mesh = state.mesh
    w = state.constraints.numbering.by_vertex(state.unknowns)[:, 0, case]
    size = float(np.abs(w[mesh.triangles[own.triangles]]).max())
    if not own.pressure.any():
        vertices = mesh.points[mesh.triangles[own.triangles]]
        numbering = state.constraints.numbering
        bent = assembly.without_rigid_motion(
            state.unknowns[numbering.table[own.triangles], case][..., None],
            vertices,
            numbering,
        )
        kappa = np.einsum(
            "nqad,nd->nqa",
            state.element.curvature(vertices, np.eye(3) * 0.98 + 0.02 / 3.0),
            bent[..., 0],
        )
        rigidity = state.plate.rigidities[mesh.zones[own.triangles]]
        size = float(np.abs(np.einsum("nab,nqb->nqa", rigidity, kappa)).max())
    return own.error * size


def kernel_forces(system: StaticSystem, own: Kernelled) -> Floats:
    """Forces of a kernel on the unknowns, (count,)."""
    numbering = system.numbering
    mesh, part = numbering.mesh, own.triangles
    vertices = mesh.points[mesh.triangles[part]]
    weights = mesh.areas[part][:, None] * own.weights
    rigidity = system.plate.rigidities[mesh.zones[part]][:, None]
    pull = (rigidity @ own.moments[..., None])[..., 0] * weights[..., None]
    found = system.element.shape.curvature_load(vertices, own.points, pull)
    if own.pressure.any():
        rows = system.element.evaluate(vertices, own.points)[:, :, 0]
        found += np.einsum("kqd,kq->kd", rows, weights * own.pressure)
    forces = np.zeros((numbering.count, 1))
    add_up(forces, numbering.table[part], found[..., None])
    return forces[:, 0]


def kernel_balance(balance: DualSystem, own: Kernelled) -> Floats:
    """Forces of a kernel on each triangle of the dual, (n_triangles, whole)."""
    mesh, part = balance.mesh, own.triangles
    vertices = mesh.points[mesh.triangles[part]]
    rigidity = balance.plate.rigidities[mesh.zones[part]]
    own_moments = own.projected @ rigidity
    coupling = balance.dual.coupling(vertices)
    found = np.einsum("koad,koa->kd", coupling, own_moments)
    if own.pressure.any():
        weights = mesh.areas[part][:, None] * own.weights
        at = np.broadcast_to(own.points, (len(part), *own.points.shape))
        rows = balance.dual.evaluate(vertices, at)[:, :, 0]
        found += np.einsum("kqd,kq->kd", rows, weights * own.pressure)
    result = np.zeros((len(mesh.triangles), balance.dual.whole))
    result[part] = found
    return result
