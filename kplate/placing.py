"""Roaming patches of a panel, set down where they govern."""

from collections.abc import Sequence
from dataclasses import dataclass, replace

from kplate.checklines import criteria, place_words, short
from kplate.errors import InputError
from kplate.panel import Panel
from kplate.roaming import HOLD_DOWN, Roamed, roam
from kplate.solve.static import Progress
from kplate.units import Unit


@dataclass(frozen=True, eq=False, kw_only=True)
class Placed:
    """A panel whose roaming patches are load cases at their governing places.

    Parameters
    ----------
    panel : Panel
        With a case for each place that governs something.
    roamed : tuple of Roamed
        What was found, one for each roaming patch.
    """

    panel: Panel
    roamed: tuple[Roamed, ...] = ()

    @property
    def words(self) -> list[str]:
        """One line for each roaming patch: what was tried and what governs where."""
        return [_words(self.panel, own) for own in self.roamed]


def placed(panel: Panel, *, progress: Progress | None = None) -> Placed:
    """Set roaming patches of a panel down where they govern.

    Parameters
    ----------
    panel : Panel
        As read.
    progress : callable, optional
        Called with a stage and the fraction done.

    Returns
    -------
    Placed

    Raises
    ------
    InputError
        If a patch fits nowhere, a combination names a roaming patch, or a place has
        the name of another case.
    """
    if not panel.roaming:
        return Placed(panel=panel)
    names = {own.name for own in panel.roaming}
    for combination in panel.combinations:
        for name in names.intersection(combination.factors):
            raise InputError(
                f"combination {combination.name!r} holds {name!r}, whose patch roams: "
                "where it governs would depend on the other cases. State what acts at "
                "the same time as the loads of that case."
            )
    roamed = tuple(
        roam(
            panel.plate,
            own,
            quantities=("deflection", *criteria(panel), HOLD_DOWN),
            progress=progress,
        )
        for own in panel.roaming
    )
    cases = [*panel.cases, *(case for own in roamed for case, _ in own.cases)]
    return Placed(panel=replace(panel, cases=tuple(cases), roaming=()), roamed=roamed)


def _words(panel: Panel, roamed: Roamed) -> str:
    length, roaming = panel.units.length, roamed.roaming
    where = f"zone {roaming.zone}" if roaming.zone else "the panel"
    governs = [
        f"{case.name} at {_centre(roamed, of, length)} for {' and '.join(of)}"
        for case, of in roamed.cases
    ]
    return (
        f"roaming {roaming.name}: {len(roamed.places)} places on {where}, "
        f"{short(roaming.step, length.size)} {length.symbol} apart at most, "
        f"{roamed.solves} solves with one factorisation; {'; '.join(governs)}. The "
        "worst of the places tried, no bound over all of them"
    )


def _centre(roamed: Roamed, quantities: Sequence[str], length: Unit) -> str:
    own = next(own for own in roamed.governing if own.quantity == quantities[0])
    return f"{place_words(own.place, length.size)} {length.symbol}"
