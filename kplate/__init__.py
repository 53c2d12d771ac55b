"""Thin flat panels from their outline to a judged answer."""

from kplate.adapt import solve
from kplate.errors import InputError, KplateError, KplateWarning, MeshError, SolveError
from kplate.limits import DeflectionLimit, Judgement, Limits, StressLimit, Verdict
from kplate.loads import (
    Case,
    DiscPatch,
    Hydrostatic,
    PointForce,
    Pressure,
    PressureField,
    RectanglePatch,
    SelfWeight,
)
from kplate.materials import (
    ALUMINIUM,
    GLASS,
    STAINLESS_STEEL,
    STEEL,
    STOCK,
    Isotropic,
)
from kplate.mesh import Mesh
from kplate.outline import Circle, Outline, Polygon
from kplate.panel import Panel, read_panel
from kplate.plate import Plate
from kplate.recovery import principal_moments
from kplate.solution import Solution
from kplate.supports import CLAMPED, FREE, SIMPLY_SUPPORTED, Support
from kplate.validity import Validity, validity
from kplate.values import Value
