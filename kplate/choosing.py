"""The command that chooses a thickness: size, tabulate, say what decides."""

import math
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

from kplate.check import CAUTION
from kplate.checklines import short
from kplate.errors import InputError
from kplate.heading import heading
from kplate.limits import StressLimit
from kplate.output.tables import columns
from kplate.panel import Panel, read_panel
from kplate.placing import Placed, placed
from kplate.sensitivity import Sensitivity, sensitivities
from kplate.sizing import Size, Sizing, size
from kplate.solve.static import Progress
from kplate.stock import Stock
from kplate.superposed import follows
from kplate.validity import FLAG

# Changes of less than this, in per cent for a per cent, are none.
NOTHING = 0.005


@dataclass(frozen=True, eq=False, kw_only=True)
class Sized:
    """A panel file, judged at every thickness of its stock.

    Parameters
    ----------
    panel : Panel
        What was read.
    sizing : Sizing
        The thicknesses.
    placed : Placed
        Where roaming patches were set down, sought at the thickness that is stated.
    """

    panel: Panel
    sizing: Sizing
    placed: Placed

    @property
    def status(self) -> int:
        """Exit status: 0 where some thickness passes, 1 where none does."""
        return 0 if self.sizing.thinnest is not None else 1

    @property
    def text(self) -> str:
        """What the command prints."""
        parts = [
            heading(self.panel),
            [_table(self)],
            [
                *_decision(self),
                *_changes(self),
                *_notes(self),
                *(f"{line}, at the thickness stated" for line in self.placed.words),
                CAUTION,
            ],
        ]
        return "\n\n".join("\n".join(part) for part in parts)


def choose_thickness(path: Path, *, progress: Progress | None = None) -> Sized:
    """Judge a panel file at every thickness of its stock.

    Parameters
    ----------
    path : Path
        The panel file; its own thickness is not used.
    progress : callable, optional
        Called with a stage and the fraction done.

    Returns
    -------
    Sized

    Raises
    ------
    InputError
        If the file cannot be read, states something wrong, no stock or no limit.
    MeshError, SolveError
        If the panel cannot be meshed or solved.
    """
    stated = read_panel(path)
    if not stated.stock:
        raise InputError(
            "[limits] stock is missing: there are no thicknesses to choose from; add "
            'stock = ["6 mm", "8 mm", "10 mm"].'
        )
    where = placed(stated, progress=progress)
    panel = where.panel
    sizing = size(
        panel.plate,
        panel.cases,
        panel.limits,
        Stock(
            thicknesses=panel.stock,
            under_tolerance=panel.under_tolerance,
            corrosion=panel.corrosion,
        ),
        combinations=panel.combinations,
        tolerance=panel.tolerance,
        triangles=panel.triangles,
        element=panel.element,
        held_in_plane=panel.held_in_plane,
        progress=progress,
    )
    return Sized(panel=panel, sizing=sizing, placed=where)


def _table(sized: Sized) -> str:
    """All thicknesses: what governs, how far, and what else is to be decided by."""
    units = sized.panel.units
    header = (
        "thickness",
        "governs",
        "used",
        "load factor",
        "w/h",
        "h/L",
        "corner hold-down",
        "mass",
        "verdict",
    )
    rows = []
    for own in sized.sizing.sizes:
        governs = own.governs
        pull, factor = own.hold_down, own.load_factor
        rows.append(
            (
                _shown(own.nominal, sized.panel),
                f"{governs.quantity}, {governs.value.case}" if governs else "-",
                f"{governs.used:.2f}" if governs else "-",
                "-" if math.isnan(factor) else f"{factor:.3g}",
                f"{own.validity.largest_deflection:.2f}",
                f"1/{1.0 / own.validity.slenderness:.0f}",
                "-" if math.isnan(pull.value) else units.force.show(pull.value),
                "-" if own.mass is None else f"{own.mass:.4g} kg",
                own.verdict.words,
            )
        )
    return columns(header, rows)


def _decision(sized: Sized) -> Iterator[str]:
    """Which thickness to take, and which where the theory is not to be flagged."""
    panel, sizing = sized.panel, sized.sizing
    first, clean = sizing.thinnest, sizing.thinnest_clean
    if first is None:
        thickest = sizing.sizes[-1]
        yield (
            f"no thickness of the stock passes; {_shown(thickest.nominal, panel)}: "
            f"{thickest.verdict.words}"
        )
        return
    yield f"{_shown(first.nominal, panel)} is the thinnest that passes."
    if first is clean:
        yield "the theory is not flagged there."
        return
    yield from (word for word in first.validity.words if word.startswith(FLAG))
    if clean is None:
        yield "no thickness of the stock passes without a flag of the theory."
    else:
        yield f"{_shown(clean.nominal, panel)} is the thinnest clean one: no flag."


def _changes(sized: Sized) -> Iterator[str]:
    """Where the verdict changes, and what the judged numbers go with."""
    panel, sizing = sized.panel, sized.sizing
    unit = panel.units.deflection
    for h in sizing.changes:
        yield f"the verdict changes at h = {unit.number(h, 3)} {unit.symbol}."
    chosen = sizing.thinnest or sizing.sizes[-1]
    yield from _goes_with(chosen, panel)


def _goes_with(chosen: Size, panel: Panel) -> Iterator[str]:
    """By how much judged numbers change with thickness, stiffness and loads."""
    solution, governs = chosen.judged.solution, chosen.governs
    if governs is None or not solution.state.element.conforming:
        return
    known = ("von Mises", "largest principal")
    stresses = [
        own.criterion
        for own in panel.limits
        if isinstance(own, StressLimit) and own.criterion in known
    ]
    found = sensitivities(solution, quantities=("deflection", *dict.fromkeys(stresses)))
    by_quantity: dict[str, list[Sensitivity]] = {}
    for own in found:
        if own.value.case == governs.value.case:
            by_quantity.setdefault(own.quantity, []).append(own)
    for quantity, changes in by_quantity.items():
        words = [
            f"{own.relative:+.2f} % for 1 % more {_parameter(own)}"
            for own in changes
            if abs(own.relative) > NOTHING
        ]
        place = f"at {_shown(chosen.nominal, panel)}, {governs.value.case}, {quantity}"
        yield f"{place}: {', '.join(words)}"


def _parameter(own: Sensitivity) -> str:
    parameter = own.parameter
    if parameter.kind == "thickness":
        return f"h of {parameter.of}" if parameter.of else "h"
    if parameter.kind == "modulus":
        return f"E of {parameter.of}"
    return f"of load {parameter.number + 1}"


def _notes(sized: Sized) -> Iterator[str]:
    """How it was found, and what was counted on."""
    panel, sizing = sized.panel, sized.sizing
    unit = panel.units.deflection
    yield f"not used: the thickness of the file, {_shown(panel.plate.thickness, panel)}"
    lost = panel.under_tolerance + panel.corrosion
    if lost:
        yield (
            f"counted on: the thickness less {unit.number(panel.under_tolerance, 3)} "
            f"{unit.symbol} under tolerance and {unit.number(panel.corrosion, 3)} "
            f"{unit.symbol} corrosion; mass and self-weight of the whole."
        )
    for limit in panel.limits:
        if isinstance(limit, StressLimit):
            yield from _strengths(sized, limit)
    if follows(panel.plate):
        yield (
            "found from one solve: moments and support forces of given loads do not "
            "change, w goes with 1/h^3, stress with 1/h^2; self-weight apart."
        )
    else:
        yield (
            "zones keep their thickness, the plate around them varies: "
            f"{sizing.solves} solves."
        )
    yield (
        "load factor: the most that all loads but the self-weight may be multiplied by."
    )


def _strengths(sized: Sized, limit: StressLimit) -> Iterator[str]:
    """Thicknesses at which a strength is less than the limit states."""
    panel = sized.panel
    found: dict[float, list[str]] = {}
    for own in sized.sizing.sizes:
        for judgement in own.verdict.judgements:
            strength = judgement.limit * limit.factor
            if judgement.stated == limit and strength < limit.strength * (1.0 - 1e-9):
                names = found.setdefault(strength, [])
                if _shown(own.nominal, panel) not in names:
                    names.append(_shown(own.nominal, panel))
    for strength, names in found.items():
        source = limit.source or "EN 10025-2"
        yield (
            f"strength {panel.units.stress.show(strength)} at {', '.join(names)} "
            f"({source})"
        )


def _shown(thickness: float, panel: Panel) -> str:
    unit = panel.units.deflection
    return f"{short(thickness, unit.size)} {unit.symbol}"
