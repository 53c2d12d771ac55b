"""Limits, how far they are used up, and the verdict.

A limit is judged at the unfavourable end of the band, whatever the kind of band. A
number without a band is judged as it is, and the verdict says so.
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from enum import IntEnum
from typing import Literal

from kplate.errors import InputError
from kplate.values import Value

Criterion = Literal["von Mises", "largest principal"]
CRITERIA: tuple[Criterion, ...] = ("von Mises", "largest principal")


@dataclass(frozen=True, kw_only=True)
class DeflectionLimit:
    """The most that a plate may deflect.

    Parameters
    ----------
    at_most : float
        Largest magnitude of the deflection in m.
    words : str
        How it was stated, such as "span/200".
    """

    at_most: float
    words: str = ""

    def __post_init__(self) -> None:
        """Check the number."""
        _check_positive("deflection limit", self.at_most)


@dataclass(frozen=True, kw_only=True)
class StressLimit:
    """The most that a surface stress may reach.

    Parameters
    ----------
    criterion : {"von Mises", "largest principal"}
        The stress that is judged, on the worse face.
    strength : float
        Strength of the material in Pa.
    factor : float
        Factor between the strength and the stress allowed.
    """

    criterion: Criterion
    strength: float
    factor: float = 1.0

    def __post_init__(self) -> None:
        """Check the numbers."""
        if self.criterion not in CRITERIA:
            raise InputError(
                f"stress criterion {self.criterion!r}; it must be one of "
                f"{', '.join(CRITERIA)}."
            )
        _check_positive("strength", self.strength)
        _check_positive("factor of the stress limit", self.factor)

    @property
    def at_most(self) -> float:
        """Largest stress allowed in Pa."""
        return self.strength / self.factor


@dataclass(frozen=True, kw_only=True)
class Limits:
    """Everything a panel is judged by; what is not stated is not judged.

    Parameters
    ----------
    deflection : DeflectionLimit, optional
        Stiffness.
    stress : StressLimit, optional
        Strength.
    hold_down : float, optional
        The most that a corner may pull on what holds it down, in N.
    """

    deflection: DeflectionLimit | None = None
    stress: StressLimit | None = None
    hold_down: float | None = None

    def __post_init__(self) -> None:
        """Check the number."""
        if self.hold_down is not None:
            _check_positive("hold-down limit", self.hold_down)


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
    """

    quantity: str
    value: Value
    limit: float

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


def governing(judgements: Sequence[Judgement]) -> Judgement | None:
    """Return the judgement with the largest utilisation."""
    known = [j for j in judgements if not math.isnan(j.used)]
    return max(known, key=lambda j: j.used, default=None)


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
