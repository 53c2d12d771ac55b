"""How a side is held, in words of the trade.

A simply supported side is *hard*: its deflection is held all along, so that the slope
along it vanishes too and the corners pull on whatever holds them down.
"""

from dataclasses import dataclass


@dataclass(frozen=True, kw_only=True)
class Support:
    """What a support holds along a side.

    Parameters
    ----------
    name : str
        The word for it.
    holds_deflection : bool
        Whether w = 0 along the side, both ways (uplift is held too).
    holds_slope : bool
        Whether the slope square to the side is held at zero.
    words : str
        What it holds, in words for a checker.
    """

    name: str
    holds_deflection: bool
    holds_slope: bool
    words: str

    @property
    def holds(self) -> bool:
        """Whether it holds anything."""
        return self.holds_deflection or self.holds_slope


CLAMPED = Support(
    name="clamped",
    holds_deflection=True,
    holds_slope=True,
    words="w = 0, rotation held, uplift held",
)
SIMPLY_SUPPORTED = Support(
    name="simply supported",
    holds_deflection=True,
    holds_slope=False,
    words="w = 0, rotation free, uplift held",
)
FREE = Support(
    name="free", holds_deflection=False, holds_slope=False, words="nothing held"
)

GUIDED = Support(
    name="guided",
    holds_deflection=False,
    holds_slope=True,
    words="rotation held, w free: a line of symmetry",
)

SUPPORTS = {
    support.name: support for support in (CLAMPED, SIMPLY_SUPPORTED, FREE, GUIDED)
}
