"""A reported number with its band, where it stands, and what kind of band that is."""

from dataclasses import dataclass, replace
from typing import Literal

from kplate.errors import InputError

Kind = Literal["bound", "estimate", "indicator", "none"]
Face = Literal["top", "bottom"]


@dataclass(frozen=True, kw_only=True)
class Value:
    """A number an engineer may quote.

    Parameters
    ----------
    value : float
        The number, SI units, in the signs of the quantity; ``nan`` where plate theory
        gives no finite answer, with the reason.
    kind : {"bound", "estimate", "indicator", "none"}
        What the band is worth: guaranteed in exact arithmetic for the stated model,
        estimated, only indicated, or not made at all (printed "not estimated").
    lower, upper : float, optional
        Ends of the band; both are absent if and only if `kind` is "none".
    place : tuple of float, optional
        Where, ``(x, y)`` in m.
    face : {"top", "bottom"}, optional
        The surface, z = +h/2 or -h/2, of a stress.
    case : str
        The load case.
    reason : str
        Why the number is missing, or needs care.

    Raises
    ------
    InputError
        If the band does not fit its kind.
    """

    value: float
    kind: Kind = "none"
    lower: float | None = None
    upper: float | None = None
    place: tuple[float, float] | None = None
    face: Face | None = None
    case: str = ""
    reason: str = ""

    def __post_init__(self) -> None:
        """Check that a band is there exactly where its kind says so."""
        if (self.kind == "none") != (self.lower is None and self.upper is None):
            raise InputError(
                f"a value of kind {self.kind!r} has the band "
                f"({self.lower}, {self.upper}); give both ends, or neither with 'none'."
            )
        if self.lower is not None and self.upper is not None:
            if not self.lower <= self.value <= self.upper:
                raise InputError(
                    f"the band ({self.lower}, {self.upper}) does not hold its value "
                    f"{self.value}; lower <= value <= upper."
                )
        elif self.lower is not self.upper:
            raise InputError("a band has two ends; give lower and upper.")

    def __neg__(self) -> "Value":
        """The same with the other sign: a pull for a push."""
        return replace(
            self,
            value=-self.value,
            lower=None if self.upper is None else -self.upper,
            upper=None if self.lower is None else -self.lower,
        )


def scaled(value: Value, factor: float) -> Value:
    """A value times a positive factor."""
    low, high = value.lower, value.upper
    return replace(
        value,
        value=factor * value.value,
        lower=None if low is None else factor * low,
        upper=None if high is None else factor * high,
    )
