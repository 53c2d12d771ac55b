"""Fields of a solved plate: values at points, and samples for files and pictures."""

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import ArrayLike

from kplate.arrays import Floats, Ints
from kplate.boundary import rigid_motions
from kplate.elements import ELEMENTS
from kplate.errors import InputError
from kplate.mesh import Mesh
from kplate.plate import Plate
from kplate.raw import RawMoments
from kplate.recovery import (
    SmoothedMoments,
    principal_moments,
    smoothed_moments,
    surface_stress,
    von_mises,
)
from kplate.samples import Samples
from kplate.singular import (
    Excluded,
    excluded_places,
)
from kplate.solve.dual import DualState
from kplate.solve.static import StaticState, StaticSystem
from kplate.values import Face
from kplate.woodarmer import design_moments

_FACES: tuple[Face, Face] = ("top", "bottom")


@dataclass(frozen=True, eq=False, kw_only=True)
class Solved:
    """A solved plate in all its load cases.

    Parameters
    ----------
    state : StaticState
        Plate, mesh, cases and unknowns.
    excluded_radius : float, optional
        Radius in m of the discs left out of the peaks of moments and stresses; the
        plate's thickness if left out.
    dual : DualState, optional
        Balanced moments on the same mesh.
    """

    state: StaticState
    excluded_radius: float | None = None
    dual: DualState | None = None

    @property
    def plate(self) -> Plate:
        """The plate as stated."""
        return self.state.plate

    @property
    def mesh(self) -> Mesh:
        """Its triangles."""
        return self.state.mesh

    @property
    def cases(self) -> tuple[str, ...]:
        """Names of the load cases."""
        return tuple(case.name for case in self.state.cases)

    @cached_property
    def system(self) -> StaticSystem:
        """The plate's stiffness on its mesh, factored, to solve for more loads."""
        own = self.state.element
        name = next(name for name, element in ELEMENTS.items() if element is own)
        return StaticSystem.of(self.plate, self.mesh, name)

    @cached_property
    def excluded(self) -> tuple[Excluded, ...]:
        """Places without a finite moment, left out of the peaks."""
        return excluded_places(self.plate, self.state.cases, self.excluded_radius)

    def deflection(self, points: ArrayLike, *, case: str | None = None) -> Floats:
        """Deflection w in m at points (k, 2) in m, (k,)."""
        return self._bent(points, case)[:, 0]

    def slopes(self, points: ArrayLike, *, case: str | None = None) -> Floats:
        """Slopes dw/dx, dw/dy at points (k, 2) in m, (k, 2)."""
        return self._bent(points, case)[:, 1:]

    def moments(self, points: ArrayLike, *, case: str | None = None) -> Floats:
        """Moments m_xx, m_yy, m_xy in N at points (k, 2) in m, (k, 3).

        Of a C1 element those of the triangle itself, of DKT smoothed ones.
        """
        found = self.recovered.moments_at(*self.mesh.locate(points))
        return found[:, :, self._index(case)]

    def balanced_moments(self, points: ArrayLike, *, case: str | None = None) -> Floats:
        """Moments of the dual in N at points (k, 2) in m, (k, 3): the safe field.

        They balance the loads in every triangle and across every edge, wherever the
        loads are no more than linear there, so that they may be designed for by the
        lower-bound theorem of plasticity. They are less smooth than `moments`.

        Raises
        ------
        InputError
            If the plate was solved without them, or a point is not on the plate.
        """
        if self.dual is None:
            raise InputError(
                "balanced moments were not asked for; call solve(..., balanced=True)."
            )
        triangles, barycentrics = self.mesh.locate(points)
        found = self.dual.moments_at(triangles, barycentrics[:, None])
        return found[:, 0, :, self._index(case)]

    def principal_moments(
        self, points: ArrayLike, *, case: str | None = None
    ) -> tuple[Floats, Floats]:
        """Principal moments (k, 2) in N, larger first, and the angle of the larger."""
        return principal_moments(self.moments(points, case=case))

    def design_moments(self, points: ArrayLike, *, case: str | None = None) -> Floats:
        """Moments in N to reinforce for along x and y, at points (k, 2) in m, (k, 4).

        Bottom x, bottom y, top x, top y, by Wood and Armer (`kplate.woodarmer`).
        """
        return design_moments(self.moments(points, case=case))

    def shears(self, points: ArrayLike, *, case: str | None = None) -> Floats:
        """Transverse shears q_x, q_y in N/m at points (k, 2) in m, (k, 2)."""
        found = self.recovered.shears_at(*self.mesh.locate(points))
        return found[:, :, self._index(case)]

    def shear_stress(self, points: ArrayLike, *, case: str | None = None) -> Floats:
        """Largest transverse shear stress 3 q / 2h in Pa, at mid-depth, (k,)."""
        q = self.shears(points, case=case)
        return 1.5 * np.hypot(*q.T) / self._thickness_at(points)

    def stresses(
        self, points: ArrayLike, *, face: Face, case: str | None = None
    ) -> Floats:
        """Stresses xx, yy, xy in Pa on a face at points (k, 2) in m, (k, 3)."""
        moments = self.moments(points, case=case)
        return surface_stress(moments, self._thickness_at(points), face)

    def von_mises(
        self, points: ArrayLike, *, face: Face, case: str | None = None
    ) -> Floats:
        """Von Mises stress in Pa on a face at points (k, 2) in m, (k,)."""
        return von_mises(self.stresses(points, face=face, case=case))

    def strain_energy(self, *, case: str | None = None) -> float:
        """Strain energy in J."""
        return float(self.state.strain_energy[self._index(case)])

    def load_force(self, *, case: str | None = None) -> float:
        """Sum of the loads in N, positive up."""
        motions = rigid_motions(self.state.constraints.numbering)[:, 0]
        return float(motions @ self.state.forces[:, self._index(case)])

    def load_work(self, *, case: str | None = None) -> float:
        """Work of the loads on their deflections in J: twice the strain energy."""
        return float(self.state.load_work[self._index(case)])

    def point_fields(
        self, *, case: str | None = None, design: bool = False
    ) -> dict[str, Floats]:
        """Fields at `field_points`, for files and pictures.

        Parameters
        ----------
        case : str, optional
            The load case; may be left out where there is only one.
        design : bool, optional
            Whether the design moments of reinforcement are among them.

        Returns
        -------
        dict of str to ndarray
            Keys carry the SI unit, such as "deflection [m]"; shapes (n,) or (n, k).
            Components are listed xx, yy, xy. "balanced" ones, where balanced moments
            were found too, are those of the dual; how far it is from the others is an
            estimate of their error, not a bound.
        """
        index, samples = self._index(case), self.samples
        bent = samples.bent[:, :, index]
        moments, shears = samples.moments[:, :, index], samples.shears[:, :, index]
        h = self.plate.thicknesses[samples.sections]
        fields = {
            "deflection [m]": bent[:, 0],
            "slopes [rad]": bent[:, 1:],
            "moments [N]": moments,
            "principal moments [N]": principal_moments(moments)[0],
            "shears [N per m]": shears,
            "shear stress [Pa]": 1.5 * np.hypot(*shears.T) / h,
        }
        for face in _FACES:
            stress = surface_stress(moments, h, face)
            fields[f"stress {face} [Pa]"] = stress
            fields[f"largest principal {face} [Pa]"] = principal_moments(stress)[0][
                :, 0
            ]
        fields["von Mises [Pa]"] = von_mises(surface_stress(moments, h, "bottom"))
        if design:
            fields["design moments [N]"] = design_moments(moments)
        if self.dual is not None:
            at = self.mesh.barycentrics(samples.holders, samples.points)
            where = samples.holders, at[:, None]
            for name, values in (
                ("balanced moments [N]", self.dual.moments_at(*where)),
                ("balanced shears [N per m]", self.dual.shears_at(*where)),
                ("balanced deflection [m]", self.dual.deflections_at(*where)),
            ):
                fields[name] = values[:, 0, ..., index]
        return fields

    @property
    def samples(self) -> Samples:
        """Places of the fields, what they are there, and the triangles between.

        Of a C1 element a lattice on each triangle of the mesh; of DKT the vertices,
        once for each part of the plate that meets there.
        """
        return self.recovered.samples

    @property
    def field_points(self) -> Floats:
        """Places of the fields in m, (n, 2)."""
        return self.samples.points

    @property
    def field_triangles(self) -> Ints:
        """Numbers of the field points of each small triangle, (m, 3)."""
        return self.samples.triangles

    @property
    def field_edges(self) -> Ints:
        """Numbers of the field points of each piece of the boundary, (k, 2)."""
        return self.samples.rim

    def _thickness_at(self, points: ArrayLike) -> Floats:
        triangles, _ = self.mesh.locate(points)
        return self.plate.thicknesses[self.mesh.zones[triangles]]

    @cached_property
    def recovered(self) -> SmoothedMoments | RawMoments:
        """Fields of the elements themselves, or of DKT smoothed ones."""
        if self.state.element.conforming:
            return RawMoments(state=self.state, excluded=self.excluded)
        return smoothed_moments(self.state)

    def _index(self, case: str | None) -> int:
        if case is None:
            if len(self.cases) > 1:
                raise InputError(
                    f"there are {len(self.cases)} load cases; name one of "
                    f"{', '.join(self.cases)}."
                )
            return 0
        if case not in self.cases:
            raise InputError(
                f"there is no load case {case!r}; the cases are "
                f"{', '.join(self.cases)}."
            )
        return self.cases.index(case)

    def _bent(self, points: ArrayLike, case: str | None) -> Floats:
        """Deflection and slopes at points, (k, 3)."""
        triangles, barycentrics = self.mesh.locate(points)
        return self._bent_at(triangles, barycentrics, self._index(case))

    def _bent_at(self, triangles: Ints, barycentrics: Floats, index: int) -> Floats:
        rows = self.state.element.evaluate(
            self.mesh.points[self.mesh.triangles[triangles]],
            barycentrics[:, None],
            self.state.constraints.numbering.arcs.among(triangles),
        )[:, 0]
        table = self.state.constraints.numbering.table[triangles]
        return np.einsum("krd,kd->kr", rows, self.state.unknowns[table, index])
