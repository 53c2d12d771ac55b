"""Limits, how far they are used up, and the verdict.

A limit is judged at the unfavourable end of the band, whatever the kind of band. A
number without a band is judged as it is, and the verdict says so.
"""

import math
from collections.abc import Iterable
from dataclasses import dataclass
from enum import IntEnum
from typing import Literal

from kplate.combinations import Purpose
from kplate.errors import InputError
from kplate.values import Value

Criterion = Literal["von Mises", "Tresca", "largest principal"]
CRITERIA: tuple[Criterion, ...] = ("von Mises", "Tresca", "largest principal")
Component = Literal["stress xx", "stress yy", "stress xy"]
COMPONENTS: tuple[Component, ...] = ("stress xx", "stress yy", "stress xy")
Where = Literal["corners", "sides", "points"]
WHERE: tuple[Where, ...] = ("corners", "sides", "points")
Sense = Literal["hold-down", "bearing"]
SENSES: tuple[Sense, ...] = ("hold-down", "bearing")


@dataclass(frozen=True, kw_only=True)
class DeflectionLimit:
    """The most that a plate may deflect, in service.

    Parameters
    ----------
    at_most : float
        Largest magnitude of the deflection in m.
    words : str, optional
        How it was stated, such as "span/200, span 600 mm".
    source : str, optional
        Where it comes from.
    """

    at_most: float
    words: str = ""
    source: str = ""

    def __post_init__(self) -> None:
        """Check the number."""
        _check_positive("deflection limit", self.at_most)

    @property
    def purpose(self) -> Purpose:
        """Of the combinations it is judged in."""
        return "service"

    @property
    def quantity(self) -> str:
        """What it judges, in words."""
        return "peak deflection"


@dataclass(frozen=True, kw_only=True)
class StepLimit:
    """The largest step to what lies beside a free side, in service.

    The neighbour is taken as rigid, so that the step is the deflection of the side.

    Parameters
    ----------
    along : str
        Name of the free side.
    at_most : float
        Largest magnitude of the deflection along it in m.
    words, source : str, optional
        As in `DeflectionLimit`.
    """

    along: str
    at_most: float
    words: str = ""
    source: str = ""

    def __post_init__(self) -> None:
        """Check the number."""
        _check_positive(f"limit of the step along {self.along}", self.at_most)

    @property
    def purpose(self) -> Purpose:
        """Of the combinations it is judged in."""
        return "service"

    @property
    def quantity(self) -> str:
        """What it judges, in words."""
        return f"step along {self.along}"


@dataclass(frozen=True, kw_only=True)
class StressLimit:
    """The most that a surface stress may reach, in strength.

    Parameters
    ----------
    criterion : {"von Mises", "Tresca", "largest principal"}
        The stress that is judged, on the worse face: von Mises or Tresca for ductile
        metal, the largest principal tension for glass and other brittle materials.
    strength : float
        Strength of the material in Pa.
    factor : float, optional
        Partial factor: the stress allowed is the strength divided by it.
    grades : tuple of (float, float), optional
        Strengths in Pa up to thicknesses in m, thinnest first, where they go by it;
        `strength` is then the first.
    words, source : str, optional
        As in `DeflectionLimit`.

    Raises
    ------
    InputError
        If a number or a word is out of range.
    """

    criterion: Criterion
    strength: float
    factor: float = 1.0
    grades: tuple[tuple[float, float], ...] = ()
    words: str = ""
    source: str = ""

    def __post_init__(self) -> None:
        """Check the numbers."""
        if self.criterion not in CRITERIA:
            raise InputError(
                f"stress criterion {self.criterion!r}; it must be one of "
                f"{', '.join(CRITERIA)}."
            )
        _check_positive("strength", self.strength)
        _check_positive("factor of the stress limit", self.factor)

    def strength_at(self, thickness: float) -> float:
        """Strength in Pa of a plate of this thickness in m.

        Raises
        ------
        InputError
            If it is thicker than the last of the grades.
        """
        if not self.grades:
            return self.strength
        for most, strength in self.grades:
            if thickness <= most * (1.0 + 1e-9):
                return strength
        raise InputError(
            f"a thickness of {1e3 * thickness:g} mm has no strength in "
            f"{self.words or 'the grades'}, which end at {1e3 * self.grades[-1][0]:g} "
            "mm; state the strength."
        )

    def allowed(self, thickness: float) -> float:
        """Largest stress allowed in Pa in a plate of this thickness in m."""
        return self.strength_at(thickness) / self.factor

    @property
    def purpose(self) -> Purpose:
        """Of the combinations it is judged in."""
        return "strength"

    @property
    def quantity(self) -> str:
        """What it judges, in words."""
        return f"peak {self.criterion}"


@dataclass(frozen=True, kw_only=True)
class StressRangeLimit:
    """The most by which a stress may change at a place between service combinations.

    Parameters
    ----------
    of : str
        A component on a face, "stress xx", "stress yy" or "stress xy", or a criterion.
        A criterion has no sign: where a stress reverses, its range is that of the
        components.
    at_most : float
        Largest range in Pa.
    words, source : str, optional
        As in `DeflectionLimit`.

    Raises
    ------
    InputError
        If a number or a word is out of range.
    """

    of: Component | Criterion
    at_most: float
    words: str = ""
    source: str = ""

    def __post_init__(self) -> None:
        """Check the words and the number."""
        if self.of not in (*COMPONENTS, *CRITERIA):
            raise InputError(
                f"stress range of {self.of!r}; it must be one of "
                f"{', '.join((*COMPONENTS, *CRITERIA))}."
            )
        _check_positive("limit of the stress range", self.at_most)

    @property
    def purpose(self) -> Purpose:
        """Of the combinations it is judged in."""
        return "service"

    @property
    def quantity(self) -> str:
        """What it judges, in words."""
        return f"range of {self.of}"


@dataclass(frozen=True, kw_only=True)
class ReactionLimit:
    """The most that a support may pull the plate down, or push it up.

    Parameters
    ----------
    at : {"corners", "sides", "points"}
        Which supports: corner forces and marks in N, line reactions of sides and seams
        in N/m.
    sense : {"hold-down", "bearing"}
        Hold-down (the support pulls the plate down) is judged in uplift, bearing (it
        pushes the plate up) in strength.
    at_most : float
        In N, or N/m along sides.
    only : tuple of str, optional
        Names of the sides, seams or marks judged, where not all are.
    words, source : str, optional
        As in `DeflectionLimit`.

    Raises
    ------
    InputError
        If a number or a word is out of range.
    """

    at: Where
    sense: Sense
    at_most: float
    only: tuple[str, ...] = ()
    words: str = ""
    source: str = ""

    def __post_init__(self) -> None:
        """Check the words and the number."""
        object.__setattr__(self, "only", tuple(self.only))
        for word, words in ((self.at, WHERE), (self.sense, SENSES)):
            if word not in words:
                raise InputError(
                    f"limit of reactions {word!r}; it must be one of "
                    f"{', '.join(words)}."
                )
        if self.only and self.at == "corners":
            raise InputError("corners have no names; a limit on them holds for all.")
        _check_positive(f"{self.sense} limit", self.at_most)

    @property
    def purpose(self) -> Purpose:
        """Of the combinations it is judged in."""
        return "uplift" if self.sense == "hold-down" else "strength"

    @property
    def quantity(self) -> str:
        """What it judges, in words."""
        what = " and ".join(self.only) or self.at.removesuffix("s")
        return f"{what} {self.sense}"


Limit = DeflectionLimit | StepLimit | StressLimit | StressRangeLimit | ReactionLimit


class Outcome(IntEnum):
    """How a judgement ended; the larger, the worse."""

    PASSES = 0
    NOT_PROVEN = 1
    FAILS = 2


@dataclass(frozen=True, kw_only=True)
class Judgement:
    """One number against its limit.

    Parameters
    ----------
    quantity : str
        What was judged.
    value : Value
        The number.
    limit : float
        The largest magnitude allowed, in the same units.
    stated : Limit, optional
        The limit as stated.
    """

    quantity: str
    value: Value
    limit: float
    stated: Limit | None = None

    @property
    def used(self) -> float:
        """Utilisation: the unfavourable magnitude over the limit."""
        return _magnitudes(self.value)[1] / self.limit

    @property
    def outcome(self) -> Outcome:
        """Passes, fails, or straddles the limit."""
        least, most = _magnitudes(self.value)
        if math.isnan(most):
            return Outcome.NOT_PROVEN
        if most <= self.limit:
            return Outcome.PASSES
        return Outcome.FAILS if least > self.limit else Outcome.NOT_PROVEN


@dataclass(frozen=True, kw_only=True)
class Verdict:
    """The judgements of a panel put together.

    Parameters
    ----------
    judgements : tuple of Judgement
        All that was judged.
    to_judge : int
        Places left out of the peaks because plate theory gives them no finite value.
    flagged : bool
        Whether the theory is used beyond where it holds.
    """

    judgements: tuple[Judgement, ...]
    to_judge: int = 0
    flagged: bool = False

    @property
    def outcome(self) -> Outcome:
        """The worst of the judgements."""
        return max((j.outcome for j in self.judgements), default=Outcome.PASSES)

    @property
    def words(self) -> str:
        """The verdict as it is printed."""
        if not self.judgements:
            return "no limit stated: nothing judged"
        if self.outcome is Outcome.FAILS:
            failed = [j.quantity for j in self.judgements if j.outcome is Outcome.FAILS]
            return f"fails: {', '.join(dict.fromkeys(failed))}"
        if self.outcome is Outcome.NOT_PROVEN:
            unknown = [j for j in self.judgements if math.isnan(j.value.value)]
            if unknown:
                return f"not proven: {unknown[0].quantity} {unknown[0].value.reason}"
            return "not proven: a band straddles its limit"
        words = "passes"
        if any(j.value.kind == "none" for j in self.judgements):
            words += ", bands not estimated"
        if self.to_judge:
            places = "place" if self.to_judge == 1 else "places"
            words += f", {self.to_judge} {places} to judge"
        if self.flagged:
            words += ", theory flagged"
        return words


def governing(judgements: Iterable[Judgement]) -> Judgement | None:
    """Return the judgement with the largest utilisation."""
    known = [j for j in judgements if not math.isnan(j.used)]
    return max(known, key=lambda j: j.used, default=None)


def worst(judgements: Iterable[Judgement]) -> Judgement | None:
    """Return the judgement that decides: what fails, what is not proven, what governs.

    Of judgements of one limit in several combinations it is the one to show.
    """
    return max(
        judgements,
        key=lambda j: (j.outcome, math.inf if math.isnan(j.used) else j.used),
        default=None,
    )


def _magnitudes(value: Value) -> tuple[float, float]:
    """Least and largest magnitude within the band."""
    if value.lower is None or value.upper is None:
        return abs(value.value), abs(value.value)
    ends = abs(value.lower), abs(value.upper)
    least = 0.0 if value.lower <= 0.0 <= value.upper else min(ends)
    return least, max(ends)


def _check_positive(what: str, number: float) -> None:
    if not (math.isfinite(number) and number > 0.0):
        raise InputError(f"the {what} is {number:g}; it must be a positive number.")
