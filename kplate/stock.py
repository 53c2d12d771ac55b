"""Thicknesses that can be bought, and what a plate may lack of one."""

import math
from dataclasses import dataclass

from kplate.errors import InputError


@dataclass(frozen=True, kw_only=True)
class Stock:
    """Thicknesses to choose from.

    Parameters
    ----------
    thicknesses : tuple of float
        Nominal thicknesses in m.
    under_tolerance : float, optional
        By how much a plate may come thinner than its nominal thickness, in m.
    corrosion : float, optional
        What is lost of it in service, in m.

    Raises
    ------
    InputError
        If there is none, one is not positive, or nothing would be left of one.
    """

    thicknesses: tuple[float, ...]
    under_tolerance: float = 0.0
    corrosion: float = 0.0

    def __post_init__(self) -> None:
        """Check and sort the thicknesses."""
        own = tuple(sorted({float(h) for h in self.thicknesses}))
        object.__setattr__(self, "thicknesses", own)
        if not own:
            raise InputError(
                "there is no thickness to choose from; list some as stock."
            )
        for name in ("under_tolerance", "corrosion"):
            loss = getattr(self, name)
            if not (math.isfinite(loss) and loss >= 0.0):
                raise InputError(f"{name} is {loss:g} m; it must be 0 or more.")
        for h in own:
            if not (math.isfinite(h) and h > 0.0):
                raise InputError(f"a stock thickness is {h:g} m; it must be positive.")
        if own[0] <= self.allowance:
            raise InputError(
                f"under_tolerance and corrosion, {1e3 * self.allowance:g} mm, leave "
                f"nothing of the stock thickness {1e3 * own[0]:g} mm; take it off the "
                "list."
            )

    @property
    def allowance(self) -> float:
        """What a plate may lack of its nominal thickness, in m."""
        return self.under_tolerance + self.corrosion
