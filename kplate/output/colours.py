"""Colours of a field: bands between round levels, pale at zero, dark at the extremes.

A field of one sign goes from pale yellow over green to dark blue; one of both signs
from white at zero to dark red and dark blue, alike on both sides. Lightness alone tells
the magnitude, so that prints in grey keep it; the two sides of zero differ in blue and
yellow, which those who do not see red and green apart do see. What lies beyond the last
level, in discs that are left out, is nearly black.
"""

from dataclasses import dataclass

import numpy as np

from kplate.arrays import Floats

MOST_LEVELS = 12  # that can be told apart, and read off a bar
TINY = 0.01  # values of the other sign below this share do not change the colours
ONE_SIGN, BOTH_SIGNS = "YlGnBu", "RdBu_r"
# Parts of the maps that are used: the ends of the one are too pale, of all too dark.
PALE, DARK = 0.04, 0.92
BEYOND = "#1b0b2e"
STEPS = (1, 2, 2.5, 5, 10)


@dataclass(frozen=True, eq=False, kw_only=True)
class Colours:
    """Levels, and what lies between them.

    Parameters
    ----------
    levels : ndarray, shape (k,)
        Round numbers, rising evenly.
    bands : ndarray, shape (k - 1, 3)
        Red, green and blue, 0 to 1, from level to level.
    below, above : bool
        Whether some of the field lies outside the levels.
    """

    levels: Floats
    bands: Floats
    below: bool
    above: bool

    @property
    def limits(self) -> tuple[float, float]:
        """First and last level."""
        return float(self.levels[0]), float(self.levels[-1])

    @property
    def inner(self) -> Floats:
        """Levels at which lines are drawn: where two colours meet."""
        return self.levels[1:-1]

    @property
    def step(self) -> float:
        """From one level to the next."""
        return float(self.levels[1] - self.levels[0])


def colours(judged: Floats, whole: Floats) -> Colours:
    """Choose levels and colours.

    Parameters
    ----------
    judged : ndarray
        Values that set the levels.
    whole : ndarray
        All values.
    """
    low, high = min(float(judged.min()), 0.0), max(float(judged.max()), 0.0)
    if -low <= TINY * high:
        low = 0.0
    if high <= -TINY * low:
        high = 0.0
    signed = low < 0.0 < high
    if signed:
        low, high = -max(-low, high), max(-low, high)
    levels = _levels(low, high)
    middles = 0.5 * (levels[:-1] + levels[1:])
    most = float(np.abs(levels).max())
    slack = TINY * most
    return Colours(
        levels=levels,
        bands=_bands(middles / most, signed),
        below=bool(whole.min() < levels[0] - slack),
        above=bool(whole.max() > levels[-1] + slack),
    )


def _bands(shares: Floats, signed: bool) -> Floats:
    """Colours of shares of the largest magnitude."""
    import matplotlib

    if signed:
        at = 0.5 + (DARK - 0.5) * shares
        return np.asarray(matplotlib.colormaps[BOTH_SIGNS](at))[:, :3]
    at = PALE + (DARK - PALE) * np.abs(shares)
    return np.asarray(matplotlib.colormaps[ONE_SIGN](at))[:, :3]


def _levels(low: float, high: float) -> Floats:
    """Round numbers from at most low to at least high; 0 and 1 if there is no range."""
    from matplotlib.ticker import MaxNLocator

    if low == high:
        return np.array([0.0, 1.0])
    locator = MaxNLocator(nbins=MOST_LEVELS, steps=list(STEPS), symmetric=low == -high)
    levels = np.asarray(locator.tick_values(low, high), dtype=np.float64)
    levels[np.abs(levels) < 1e-9 * np.abs(levels).max()] = 0.0
    # No empty band at an end.
    step, hair = levels[1] - levels[0], 1e-9
    first = int(np.flatnonzero(levels <= low + hair * step)[-1])
    last = int(np.flatnonzero(levels >= high - hair * step)[0])
    return levels[first : last + 1]
