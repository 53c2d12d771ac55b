"""Limits of codes and of practice, by name, each with its source and how it was read.

None is a default: a panel names the one it is judged by, and its source is shown with
the result. What stands here from memory or second-hand says "check": look it up in the
edition that binds before relying on it.
"""

from dataclasses import dataclass

from kplate.limits import Criterion

SECOND_HAND = "read second-hand: check"
MEMORY = "from memory: check"


@dataclass(frozen=True, kw_only=True)
class DeflectionPreset:
    """A share of the span, a length, or the lesser of both.

    Parameters
    ----------
    parts : float, optional
        The span is divided by it.
    most : float, optional
        Length in m.
    source : str
        Where it comes from.
    """

    parts: float | None = None
    most: float | None = None
    source: str


@dataclass(frozen=True, kw_only=True)
class StressPreset:
    """A strength, by thickness where it goes by it.

    Parameters
    ----------
    criterion : str
        The criterion that suits the material.
    grades : tuple of (float, float)
        Strengths in Pa up to thicknesses in m, thinnest first.
    source : str
        Where they come from.
    """

    criterion: Criterion
    grades: tuple[tuple[float, float], ...]
    source: str


DEFLECTIONS = {
    "walkway ISO 14122-2": DeflectionPreset(
        parts=200.0, source=f"ISO 14122-2, {SECOND_HAND}"
    ),
    "flooring BS 4592-0": DeflectionPreset(
        parts=200.0, most=0.010, source=f"BS 4592-0, {MEMORY}"
    ),
    "floor EN 1993-1-1 France, total": DeflectionPreset(
        parts=200.0, source="French annex to EN 1993-1-1"
    ),
    "floor EN 1993-1-1 France, variable": DeflectionPreset(
        parts=300.0, source="French annex to EN 1993-1-1"
    ),
    "floor IBC, live": DeflectionPreset(parts=360.0, source="IBC, Table 1604.3"),
    "floor IBC, dead and live": DeflectionPreset(
        parts=240.0, source="IBC, Table 1604.3"
    ),
    "glass EN 16612": DeflectionPreset(
        parts=65.0, most=0.050, source=f"EN 16612, {SECOND_HAND}"
    ),
    "bolted flat cover": DeflectionPreset(
        most=0.0008, source="common practice for heat exchangers"
    ),
}
STEPS = {
    "walkway ISO 14122-2": DeflectionPreset(
        most=0.004, source=f"ISO 14122-2, {SECOND_HAND}"
    ),
}
_EN_10025_2 = "EN 10025-2"
_THICK = 1e9  # m: whatever the thickness


def _steel(*strengths: float) -> StressPreset:
    """Yield strengths in MPa up to 16, 40 and 63 mm."""
    sizes = (0.016, 0.040, 0.063)
    grades = tuple((h, 1e6 * f) for h, f in zip(sizes, strengths, strict=True))
    return StressPreset(criterion="von Mises", grades=grades, source=_EN_10025_2)


STRENGTHS = {
    "steel S235 EN 10025-2": _steel(235, 225, 215),
    "steel S275 EN 10025-2": _steel(275, 265, 255),
    "steel S355 EN 10025-2": _steel(355, 345, 335),
    "stainless 1.4301": StressPreset(
        criterion="von Mises", grades=((_THICK, 210e6),), source=MEMORY
    ),
    "aluminium 5083": StressPreset(
        criterion="von Mises", grades=((_THICK, 125e6),), source=MEMORY
    ),
    "float glass": StressPreset(
        criterion="largest principal", grades=((_THICK, 45e6),), source=MEMORY
    ),
}
# Partial factors of materials.
FACTORS = {"steel": (1.0, MEMORY), "annealed glass": (1.8, MEMORY)}
