"""Units to show numbers in; everything inside kplate is SI.

Other units are read once, at the panel file, and chosen for display only in tables,
pictures and records.
"""

from dataclasses import dataclass


@dataclass(frozen=True)
class Unit:
    """A unit of display.

    Parameters
    ----------
    symbol : str
        How it is written.
    size : float
        Its size in SI units.
    """

    symbol: str
    size: float

    def show(self, value: float, digits: int = 4) -> str:
        """Write an SI value in this unit, such as ``1.657 mm``."""
        return f"{self.number(value, digits)} {self.symbol}"

    def number(self, value: float, digits: int = 4) -> str:
        """Write an SI value in this unit, without the symbol."""
        shown = f"{value / self.size:#.{digits}g}"
        if "e" in shown:
            return shown
        return shown.rstrip(".")


@dataclass(frozen=True, kw_only=True)
class DisplayUnits:
    """The units a panel is shown in."""

    length: Unit = Unit("mm", 1e-3)
    deflection: Unit = Unit("mm", 1e-3)
    force: Unit = Unit("N", 1.0)
    line_force: Unit = Unit("N/mm", 1e3)
    moment: Unit = Unit("N", 1.0)
    pressure: Unit = Unit("kPa", 1e3)
    stress: Unit = Unit("MPa", 1e6)
