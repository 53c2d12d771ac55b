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
        """Write an SI value in this unit, without the symbol.

        Examples
        --------
        >>> N = Unit("N", 1.0)
        >>> [N.number(value) for value in (-0.0, 0.03456, 1500.0, 12345.6, 1e-9)]
        ['0.000', '0.03456', '1500', '12350', '1.000e-09']
        """
        shown = value / self.size + 0.0  # which makes -0.0 a plain 0.0
        text = f"{shown:#.{digits}g}"
        if "e+" in text and abs(shown) < 1e7:
            return f"{float(text):.0f}"
        return text.rstrip(".")


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
