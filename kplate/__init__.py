"""Thin flat panels from their outline to a judged answer.

State a panel, ask a question, get a number you can sign::

    import kplate as kp

    cover = kp.Plate(
        outline=kp.Outline.polygon([(0, 0), (0.8, 0), (0.8, 0.6), (0, 0.6)]),
        thickness=0.006,
        material=kp.STEEL,
        supports={f"side-{i}": kp.SIMPLY_SUPPORTED for i in (1, 2, 3, 4)},
    )
    solution = kp.solve(cover, [kp.Pressure(-5e3)])
    solution.peak("deflection")

SI units; z, deflections, pressures and forces positive up; moments positive where they
compress the top face. Results are for a qualified engineer's judgement; local codes and
licensed practice decide.
"""

from kplate.adapt import solve
from kplate.asking import Ask
from kplate.check import Checked, check
from kplate.choosing import Sized, choose_thickness
from kplate.combinations import Combination, preset_combinations
from kplate.combining import combine
from kplate.comparing import Comparison, compare
from kplate.envelope import Envelope
from kplate.errors import InputError, KplateError, KplateWarning, MeshError, SolveError
from kplate.goals import (
    ClampingMoment,
    Deflection,
    Goal,
    LineReaction,
    MeanDeflection,
    Moment,
    Peak,
    Resultant,
    RimMoment,
    Shear,
    Slope,
)
from kplate.independent import Independent, independent
from kplate.influence import InfluenceSurface, influence
from kplate.judging import judge
from kplate.limits import (
    DeflectionLimit,
    Judgement,
    ReactionLimit,
    StepLimit,
    StressLimit,
    StressRangeLimit,
    Verdict,
)
from kplate.loads import (
    Case,
    DiscPatch,
    EdgeMoment,
    Hydrostatic,
    LineForce,
    PointForce,
    PointMoment,
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
from kplate.outline import Outline
from kplate.output.animate import write_animation
from kplate.output.forcerows import write_reactions
from kplate.output.history import write_history
from kplate.output.notebook import attach as _attach
from kplate.output.picture import write_picture
from kplate.output.plot import plot
from kplate.output.record import solution_record, write_json
from kplate.output.surface import write_influence
from kplate.output.view import view, write_view
from kplate.output.vtk import write_vtk
from kplate.panel import Panel, read_panel
from kplate.patches import Roaming
from kplate.plate import Plate, Section
from kplate.polygon import Polygon
from kplate.recovery import principal_moments
from kplate.roaming import Roamed, roam
from kplate.sensitivity import Parameter, Sensitivity, sensitivities
from kplate.shapes import Circle, Ellipse, Rectangle, Slot
from kplate.sizing import Size, Sizing, size
from kplate.solution import Solution
from kplate.stock import Stock
from kplate.supports import CLAMPED, FREE, GUIDED, SIMPLY_SUPPORTED, Support
from kplate.validity import Validity, validity
from kplate.values import Value
from kplate.woodarmer import design_moments

__all__ = [
    "ALUMINIUM",
    "CLAMPED",
    "FREE",
    "GLASS",
    "GUIDED",
    "SIMPLY_SUPPORTED",
    "STAINLESS_STEEL",
    "STEEL",
    "STOCK",
    "Ask",
    "Case",
    "Checked",
    "Circle",
    "ClampingMoment",
    "Combination",
    "Comparison",
    "Deflection",
    "DeflectionLimit",
    "DiscPatch",
    "EdgeMoment",
    "Ellipse",
    "Envelope",
    "Goal",
    "Hydrostatic",
    "Independent",
    "InfluenceSurface",
    "InputError",
    "Isotropic",
    "Judgement",
    "KplateError",
    "KplateWarning",
    "LineForce",
    "LineReaction",
    "MeanDeflection",
    "Mesh",
    "MeshError",
    "Moment",
    "Outline",
    "Panel",
    "Parameter",
    "Peak",
    "Plate",
    "PointForce",
    "PointMoment",
    "Polygon",
    "Pressure",
    "PressureField",
    "ReactionLimit",
    "Rectangle",
    "RectanglePatch",
    "Resultant",
    "RimMoment",
    "Roamed",
    "Roaming",
    "Section",
    "SelfWeight",
    "Sensitivity",
    "Shear",
    "Size",
    "Sized",
    "Sizing",
    "Slope",
    "Slot",
    "Solution",
    "SolveError",
    "StepLimit",
    "Stock",
    "StressLimit",
    "StressRangeLimit",
    "Support",
    "Validity",
    "Value",
    "Verdict",
    "check",
    "choose_thickness",
    "combine",
    "compare",
    "design_moments",
    "independent",
    "influence",
    "judge",
    "plot",
    "preset_combinations",
    "principal_moments",
    "read_panel",
    "roam",
    "sensitivities",
    "size",
    "solution_record",
    "solve",
    "validity",
    "view",
    "write_animation",
    "write_history",
    "write_influence",
    "write_json",
    "write_picture",
    "write_reactions",
    "write_view",
    "write_vtk",
]

_attach(Checked)  # displays of a notebook
