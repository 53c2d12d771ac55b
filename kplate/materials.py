"""Elastic materials: a few from stock with their sources, and the plate's rigidity.

The rigidity turns the curvature ``(w,xx, w,yy, 2 w,xy)`` into the moments
``(m_xx, m_yy, m_xy)``. For an isotropic plate of thickness h

    rigidity = D [[1, nu, 0], [nu, 1, 0], [0, 0, (1 - nu)/2]],
    D = E h^3 / (12 (1 - nu^2)).

Source: S. Timoshenko and S. Woinowsky-Krieger, "Theory of Plates and Shells", 2nd ed.,
McGraw-Hill, 1959, ch. 2 (from memory).
"""

import math
import warnings
from dataclasses import dataclass

import numpy as np

from kplate.arrays import Floats
from kplate.errors import InputError, KplateWarning

# Young's moduli of anything sold as sheet lie well inside; outside, a unit is wrong.
USUAL_E = (0.1e9, 1000e9)  # Pa


@dataclass(frozen=True, kw_only=True)
class Isotropic:
    """A material with the same stiffness in every direction.

    Parameters
    ----------
    name : str
        How the material is called in tables.
    E : float
        Young's modulus in Pa; a value outside 0.1 to 1000 GPa draws a warning.
    nu : float
        Poisson's ratio, 0 to 0.5.
    density : float, optional
        Mass density in kg/m3; needed for self-weight and mass only.
    source : str
        Where the numbers come from.

    Raises
    ------
    InputError
        If a number is not finite or outside its range.
    """

    name: str
    E: float
    nu: float
    density: float | None = None
    source: str = ""

    def __post_init__(self) -> None:
        """Check the numbers."""
        if not (math.isfinite(self.E) and self.E > 0.0):
            raise InputError(
                f"material {self.name!r}: E = {self.E:g} Pa; Young's modulus must be "
                "a positive number."
            )
        if not 0.0 <= self.nu <= 0.5:
            raise InputError(
                f"material {self.name!r}: nu = {self.nu:g}; Poisson's ratio must lie "
                "between 0 and 0.5."
            )
        if self.density is not None and not (
            math.isfinite(self.density) and self.density > 0.0
        ):
            raise InputError(
                f"material {self.name!r}: density = {self.density:g} kg/m3; it must be "
                "a positive number."
            )
        if not USUAL_E[0] <= self.E <= USUAL_E[1]:
            warnings.warn(
                f"material {self.name!r}: E = {self.E:.4g} Pa is outside 0.1 to "
                "1000 GPa; check its unit.",
                KplateWarning,
                stacklevel=3,
            )

    def bending_stiffness(self, thickness: float) -> float:
        """Bending stiffness D of a plate of this thickness (m), in N m."""
        return self.E * thickness**3 / (12.0 * (1.0 - self.nu**2))

    def rigidity(self, thickness: float) -> Floats:
        """Moments per curvature for a plate of this thickness (m), (3, 3) in N m."""
        nu = self.nu
        shape = np.array([[1.0, nu, 0.0], [nu, 1.0, 0.0], [0.0, 0.0, 0.5 * (1.0 - nu)]])
        return self.bending_stiffness(thickness) * shape


_EN_10025 = "EN 10025-2 grades; elastic constants of EN 1993-1-1, 3.2.6 (from memory)"
STEEL = Isotropic(name="steel S235", E=210e9, nu=0.3, density=7850.0, source=_EN_10025)
STAINLESS_STEEL = Isotropic(
    name="stainless 1.4301",
    E=200e9,
    nu=0.3,
    density=7900.0,
    source="EN 10088 and EN 1993-1-4 (from memory)",
)
ALUMINIUM = Isotropic(
    name="aluminium 5083",
    E=70e9,
    nu=0.3,
    density=2660.0,
    source="EN 1999-1-1 (from memory)",
)
GLASS = Isotropic(
    name="float glass",
    E=70e9,
    nu=0.23,
    density=2500.0,
    source="EN 572-1 gives 0.2 for nu; 0.23 is common practice in plate design",
)

STOCK = {
    material.name: material
    for material in (
        STEEL,
        Isotropic(name="steel S275", E=210e9, nu=0.3, density=7850.0, source=_EN_10025),
        Isotropic(name="steel S355", E=210e9, nu=0.3, density=7850.0, source=_EN_10025),
        STAINLESS_STEEL,
        ALUMINIUM,
        GLASS,
    )
}
