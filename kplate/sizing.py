"""Which thickness passes: verdicts over a list of thicknesses from one solve.

A plate whose sections all follow its thickness is solved once, at the thinnest; every
other thickness is that solution scaled (`kplate.superposed`), judged for itself. Where
a zone keeps a thickness of its own, only the plate around it varies and each thickness
is solved anew.

Stiffness and strength are those of the net thickness, the nominal one less what the
mill and corrosion may take; weight and mass, and strengths that go by thickness, those
of the nominal one.
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from functools import cached_property
from itertools import pairwise

import numpy as np

from kplate.adapt import default_goals, solve
from kplate.arrays import Floats
from kplate.basis import Basis
from kplate.choice import AUTO
from kplate.combinations import Combination, combined_cases, expanded, factor_table
from kplate.errors import InputError
from kplate.extremes import corner_extreme
from kplate.judging import Judged, judgements, to_judge
from kplate.limits import (
    Judgement,
    Limit,
    Outcome,
    StressLimit,
    Verdict,
    governing,
)
from kplate.loads import Case, SelfWeight
from kplate.plate import Plate
from kplate.presets import STRENGTHS
from kplate.solve.static import Progress
from kplate.stock import Stock
from kplate.superposed import Superposed, follows, unit_cases
from kplate.validity import Validity, validity
from kplate.values import Value

# The thickness at which a verdict changes is sought within these factors of the stock,
# to this share of it.
_BEYOND, _CLOSE = 8.0, 1e-6
# A load factor is found to this share, on the safe side.
_FACTOR = 1e-3
_MOST = 40  # steps on the way to it
_ENDLESS = 1e6  # a factor beyond is none


@dataclass(frozen=True, eq=False, kw_only=True)
class Size:
    """A thickness, judged.

    Parameters
    ----------
    nominal, net : float
        Thickness in m as bought, and what is counted on.
    judged : Judged
        The plate at its net thickness, in what is judged.
    verdict : Verdict
        The judgement.
    validity : Validity
        Whether the theory holds.
    mass : float or None
        In kg, of the nominal thickness; None where a material states no density.
    """

    nominal: float
    net: float
    judged: Judged
    verdict: Verdict
    validity: Validity
    mass: float | None
    _family: "_Family" = field(repr=False)

    @property
    def passes(self) -> bool:
        """Whether every limit is met, whatever the theory's flags."""
        return bool(self.verdict.judgements) and self.verdict.outcome is Outcome.PASSES

    @property
    def clean(self) -> bool:
        """Whether it passes and the theory holds."""
        return self.passes and self.validity.holds

    @property
    def governs(self) -> Judgement | None:
        """The judgement with the largest utilisation."""
        return governing(self.verdict.judgements)

    @property
    def hold_down(self) -> Value:
        """Largest pull in N of a corner on its fixing, over all that is judged."""
        names = self.judged.names("uplift") or self.judged.solution.cases
        pulls = [
            corner_extreme(self.judged.solution, "hold-down", case=name)[0]
            for name in names
        ]
        lost = [pull for pull in pulls if math.isnan(pull.value)]
        return lost[0] if lost else max(pulls, key=lambda pull: pull.value)

    @cached_property
    def load_factor(self) -> float:
        """Largest factor on all loads but the self-weight with which all limits hold.

        Found on the safe side; infinite where loads do not matter, 0 where the
        self-weight alone breaks a limit.
        """
        return self._family.load_factor(self)


@dataclass(frozen=True, eq=False, kw_only=True)
class Sizing:
    """All thicknesses of a stock, judged.

    Parameters
    ----------
    sizes : tuple of Size
        Thinnest first.
    solves : int
        How often the plate was solved.
    """

    sizes: tuple[Size, ...]
    solves: int
    _family: "_Family" = field(repr=False)

    @property
    def thinnest(self) -> Size | None:
        """The thinnest that passes, flagged or not."""
        return next((size for size in self.sizes if size.passes), None)

    @property
    def thinnest_clean(self) -> Size | None:
        """The thinnest that passes with no flag of the theory."""
        return next((size for size in self.sizes if size.clean), None)

    @cached_property
    def changes(self) -> tuple[float, ...]:
        """Nominal thicknesses in m, of any size, at which the verdict changes.

        Between neighbours of the stock of which one passes; beyond its ends where all
        pass or none does. Empty where none is found, or zones keep their thickness.
        """
        return self._family.changes(self.sizes)


def size(
    plate: Plate,
    cases: Sequence[Case],
    limits: Sequence[Limit],
    stock: Stock,
    *,
    combinations: Sequence[Combination] = (),
    tolerance: float | None = 0.01,
    triangles: int | None = None,
    element: str = AUTO,
    held_in_plane: bool | None = None,
    progress: Progress | None = None,
) -> Sizing:
    """Judge a plate at every thickness of a stock.

    Parameters
    ----------
    plate : Plate
        The statement; its thickness is varied, those that zones state are not.
    cases : sequence of Case
        The load cases.
    limits : sequence of Limit
        What it is judged by.
    stock : Stock
        The thicknesses.
    combinations : sequence of Combination, optional
        Of the cases.
    tolerance, triangles, element, progress
        As in `kplate.solve`; a tolerance is not used where triangles are stated.
    held_in_plane : bool, optional
        What is known about its edges.

    Returns
    -------
    Sizing

    Raises
    ------
    InputError
        If there is no limit, or anything that `kplate.solve` or a limit refuses.
    MeshError, SolveError
        If the plate cannot be meshed or solved.

    Examples
    --------
    >>> import kplate as kp
    >>> cover = kp.Plate(
    ...     outline=kp.Outline.polygon([(0, 0), (0.8, 0), (0.8, 0.6), (0, 0.6)]),
    ...     thickness=0.006,
    ...     material=kp.STEEL,
    ...     supports={f"side-{i}": kp.SIMPLY_SUPPORTED for i in (1, 2, 3, 4)},
    ... )
    >>> found = kp.size(
    ...     cover,
    ...     [kp.Case(name="crowd", loads=[kp.Pressure(-5e3)])],
    ...     [kp.DeflectionLimit(at_most=0.003)],
    ...     kp.Stock(thicknesses=(0.003, 0.004, 0.005, 0.006)),
    ... )
    >>> found.thinnest.nominal, found.thinnest_clean.nominal, found.solves
    (0.005, 0.005, 1)
    """
    if not limits:
        raise InputError(
            "no limit is stated, so that every thickness would pass; state one."
        )
    family = _Family(
        plate=plate,
        cases=tuple(cases),
        limits=tuple(limits),
        combinations=expanded(cases, combinations),
        allowance=stock.allowance,
        options={
            "tolerance": tolerance if triangles is None else None,
            "triangles": triangles,
            "element": element,
            "progress": progress,
        },
        held_in_plane=held_in_plane,
        thinnest=stock.thicknesses[0] - stock.allowance,
    )
    sizes = tuple(family.at(h) for h in stock.thicknesses)
    return Sizing(sizes=sizes, solves=len(family.known), _family=family)


@dataclass(frozen=True, eq=False, kw_only=True)
class _Family:
    """A plate at any thickness."""

    plate: Plate
    cases: tuple[Case, ...]
    limits: tuple[Limit, ...]
    combinations: tuple[Combination, ...]
    allowance: float
    options: dict[str, object]
    held_in_plane: bool | None
    thinnest: float
    known: dict[float, Basis] = field(default_factory=dict)

    def at(self, nominal: float, factor: float = 1.0) -> Size:
        """A nominal thickness, under loads but the self-weight times a factor."""
        net = nominal - self.allowance
        judged = self._judged(nominal, net, factor)
        found = tuple(self._graded(own, nominal) for own in self._judgements(judged))
        theory = validity(judged.solution, held_in_plane=self.held_in_plane)
        verdict = Verdict(
            judgements=found,
            to_judge=to_judge(judged, self.limits),
            flagged=not theory.holds,
        )
        return Size(
            nominal=nominal,
            net=net,
            judged=judged,
            verdict=verdict,
            validity=theory,
            mass=replace(self.plate, thickness=nominal).mass,
            _family=self,
        )

    def used(self, nominal: float, factor: float = 1.0) -> float:
        """Largest utilisation."""
        judged = self._judged(nominal, nominal - self.allowance, factor)
        found = [self._graded(own, nominal).used for own in self._judgements(judged)]
        return math.nan if any(map(math.isnan, found)) else max(found)

    def load_factor(self, size: Size) -> float:
        """As `Size.load_factor`.

        A utilisation is convex in the factor: a chord from where it is less than 1 to
        where it is more meets 1 before it does, on the safe side.
        """
        now = max((j.used for j in size.verdict.judgements), default=math.nan)
        if math.isnan(now):
            return math.nan
        if not any(isinstance(own, SelfWeight) for c in self.cases for own in c.loads):
            return 1.0 / now if now > 0.0 else math.inf
        low, used_low, high, used_high = 0.0, math.nan, 1.0, now
        if now <= 1.0:
            low, used_low = 1.0, now
            high = 1.05 / max(now, 1.0 / _MOST)
            while (used_high := self.used(size.nominal, high)) <= 1.0:
                low, used_low, high = high, used_high, 2.0 * high
                if high > _ENDLESS:
                    return math.inf
        elif (used_low := self.used(size.nominal, 0.0)) > 1.0:
            return 0.0
        for _ in range(_MOST):
            safe = low + (1.0 - used_low) / (used_high - used_low) * (high - low)
            further = safe * (1.0 + _FACTOR)
            if further >= high:
                return safe
            used = self.used(size.nominal, further)
            if used > 1.0:
                return safe
            low, used_low = further, used
        return low

    def changes(self, sizes: Sequence[Size]) -> tuple[float, ...]:
        """As `Sizing.changes`."""
        if not follows(self.plate):
            return ()
        pairs = [
            (a.nominal, b.nominal) for a, b in pairwise(sizes) if a.passes != b.passes
        ]
        if not pairs:
            pairs = self._beyond(sizes)
        return tuple(self._change(*pair) for pair in pairs)

    def _beyond(self, sizes: Sequence[Size]) -> list[tuple[float, float]]:
        """Thicknesses beyond an end of the stock between which the verdict changes."""
        passing = sizes[0].passes
        end = sizes[0].nominal if passing else sizes[-1].nominal
        step = 1.0 / 1.25 if passing else 1.25
        h = end
        while 1.0 / _BEYOND < h / end < _BEYOND:
            last, h = h, h * step
            if h <= self.allowance:
                return []
            if (self.used(h) <= 1.0) != passing:
                return [(min(last, h), max(last, h))]
        return []

    def _change(self, low: float, high: float) -> float:
        """Thickness between two at which the largest utilisation passes 1."""
        from scipy.optimize import brentq

        def off(h: float) -> float:
            return math.log(max(self.used(h), 1e-300))

        return float(brentq(off, low, high, xtol=_CLOSE * low, rtol=_CLOSE))

    def _judgements(self, judged: Judged) -> tuple[Judgement, ...]:
        return judgements(judged, self.limits)

    def _graded(self, judgement: Judgement, nominal: float) -> Judgement:
        """The judgement, with the strength that the nominal thickness has."""
        limit = judgement.stated
        if not isinstance(limit, StressLimit):
            return judgement
        return replace(judgement, limit=allowed_at(self.plate, limit, nominal))

    def _judged(self, nominal: float, net: float, factor: float) -> Judged:
        units, weights = unit_cases(self.cases)
        names = [case.name for case in self.cases]
        loads, plate = self._loads(nominal / net), replace(self.plate, thickness=net)
        if self.combinations:
            weights = weights @ factor_table(self.cases, self.combinations)
            loads = combined_cases(loads, self.combinations)
            names = [own.name for own in self.combinations]
        basis = self._basis(net, nominal, units, weights, names)
        own = basis.solution.plate.thickness
        pulled = np.array(
            [any(isinstance(x, SelfWeight) for x in case.loads) for case in units]
        )
        # The weight is that of the nominal thickness.
        scale = np.where(pulled, nominal / own, factor)
        solution = Superposed.of(basis, plate, loads, scale[:, None] * weights)
        return Judged(solution=solution, combinations=self.combinations)

    def _loads(self, heavier: float) -> tuple[Case, ...]:
        """The cases, with self-weights so much heavier than the net thickness is."""
        return tuple(
            replace(
                case,
                loads=[
                    replace(load, acceleration=heavier * load.acceleration)
                    if isinstance(load, SelfWeight)
                    else load
                    for load in case.loads
                ],
            )
            for case in self.cases
        )

    def _basis(
        self,
        net: float,
        nominal: float,
        units: Sequence[Case],
        weights: Floats,
        names: Sequence[str],
    ) -> Basis:
        """The solved unit cases from which a thickness follows."""
        own = self.thinnest if follows(self.plate) else net
        if own not in self.known:
            stressed = [x.criterion for x in self.limits if isinstance(x, StressLimit)]
            plate = replace(self.plate, thickness=own)
            sums = [
                Combination(
                    name=name,
                    factors={
                        case.name: w * (1.0 + self.allowance / own)
                        if isinstance(case.loads[0], SelfWeight)
                        else w
                        for case, w in zip(units, column, strict=True)
                    },
                    purpose="every",
                )
                for name, column in zip(names, weights.T, strict=True)
            ]
            solution = solve(
                plate,
                units,
                goals=default_goals(plate, *dict.fromkeys(stressed)),
                combinations=sums,
                **self.options,  # type: ignore[arg-type]  # as size has them
            )
            self.known[own] = Basis(solution=solution)
        return self.known[own]


def allowed_at(plate: Plate, limit: StressLimit, nominal: float) -> float:
    """Largest stress allowed in Pa at a nominal thickness in m.

    The least of what the limit states and of what the plate's steels have at the
    thickness.
    """
    strength = limit.strength_at(nominal)
    if limit.criterion != "largest principal":
        for h, material in plate.sections:
            thickest = nominal if h == plate.thickness else h
            known = steel_strength(material.name, thickest)
            if known is not None:
                strength = min(strength, known)
    return strength / limit.factor


def steel_strength(name: str, nominal: float) -> float | None:
    """Yield strength in Pa of a steel by its nominal thickness in m, EN 10025-2.

    ``None`` where none is known: of other materials, and beyond 63 mm.

    Examples
    --------
    >>> steel_strength("steel S235", 0.020)
    225000000.0
    """
    preset = STRENGTHS.get(f"{name} EN 10025-2")
    for most, strength in preset.grades if preset is not None else ():
        if nominal <= most * (1.0 + 1e-9):
            return strength
    return None
