"""What a solution answers besides values: growth towards a place, steps taken."""

from dataclasses import dataclass

from kplate.values import Value

NO_BAND = "no goal has a band"


@dataclass(frozen=True, kw_only=True)
class Growth:
    """How a quantity grows towards a place without a finite moment.

    Parameters
    ----------
    value : Value
        Its largest value at the distance asked for.
    distance : float
        That distance in m.
    power : float or None
        Moments and stresses go with distance to this power, of a corner; ``None`` where
        they go with the logarithm of it, such as at a point force.
    words : str
        The law, for a checker.
    """

    value: Value
    distance: float
    power: float | None
    words: str


@dataclass(frozen=True, eq=False, kw_only=True)
class Step:
    """One mesh on the way to a tolerance.

    Parameters
    ----------
    unknowns : int
        Free unknowns of the plate.
    triangles : int
        Triangles of the mesh.
    seconds : float
        Time since the start.
    bands : dict of str to float
        Half width of each goal's band as a share of its value, the widest of the cases;
        empty where no goal has a band.
    reached : bool
        Whether every goal that has a band is inside the tolerance; not where none has.
    """

    unknowns: int
    triangles: int
    seconds: float
    bands: dict[str, float]
    reached: bool

    @property
    def words(self) -> str:
        """One line: unknowns, band per goal, seconds."""
        bands = ", ".join(f"{name} {100 * b:.2g} %" for name, b in self.bands.items())
        known = bands or NO_BAND
        return f"{self.unknowns} unknowns, {self.seconds:.1f} s: {known}"
