"""Combinations: factors on load cases, each for a purpose.

A case that reverses acts with both signs: a combination that holds it stands for two,
with the case as stated and reversed.

Factors of the presets: EN 1990, Tables A1.2(A) for EQU and A1.2(B) for STR, of which
the numbers were read in a public copy and the table numbers are from memory. A variable
action that helps has the factor 0. No psi factor is applied: the variable cases of a
preset act together, each in full, or not.
"""

import itertools
import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from types import MappingProxyType
from typing import Literal, cast

import numpy as np

from kplate.arrays import Floats
from kplate.errors import InputError
from kplate.loads import (
    Case,
    DiscPatch,
    EdgeMoment,
    Hydrostatic,
    LineForce,
    Load,
    PointForce,
    PointMoment,
    Pressure,
    PressureField,
    RectanglePatch,
    SelfWeight,
)

Purpose = Literal["strength", "service", "uplift", "every"]
PURPOSES: tuple[Purpose, ...] = ("strength", "service", "uplift", "every")
MOST = 200  # combinations, those of both signs included


@dataclass(frozen=True, eq=False, kw_only=True)
class Combination:
    """Load cases that act together, each with a factor.

    Parameters
    ----------
    name : str
        How the combination is called in tables.
    factors : mapping of str to float
        Factor of each case, by its name; a case that is not named does not act.
    purpose : {"strength", "service", "uplift", "every"}
        What it is for: strength judges stresses and bearing, service deflections,
        steps and stress ranges, uplift hold-down; every judges all.
    source : str, optional
        Where the factors come from.

    Raises
    ------
    InputError
        If it has no name, no factor but 0, or the purpose is none of those.
    """

    name: str
    factors: Mapping[str, float]
    purpose: Purpose
    source: str = ""

    def __post_init__(self) -> None:
        """Check name, factors and purpose."""
        factors = {case: float(factor) for case, factor in self.factors.items()}
        object.__setattr__(self, "factors", MappingProxyType(factors))
        if not self.name:
            raise InputError("a combination has no name; give it one.")
        for case, factor in factors.items():
            if not math.isfinite(factor):
                raise InputError(
                    f"combination {self.name!r}: the factor of case {case!r} is "
                    f"{factor:g}; it must be finite."
                )
        if not any(factors.values()):
            raise InputError(
                f"combination {self.name!r} has no factor but 0; give at least one."
            )
        if self.purpose not in PURPOSES:
            raise InputError(
                f"combination {self.name!r}: purpose {self.purpose!r}; it must be one "
                f"of {', '.join(PURPOSES)}."
            )

    @property
    def words(self) -> str:
        """The factors, as they are written."""
        words = ""
        for case, factor in self.factors.items():
            if factor:
                sign = " - " if factor < 0.0 else " + "
                words += f"{sign}{abs(factor):g} {case}"
        return words.removeprefix(" + ").removeprefix(" ")


@dataclass(frozen=True, kw_only=True)
class Preset:
    """Factors of a code.

    Parameters
    ----------
    label : str
        How names of its combinations begin.
    purpose : {"strength", "service", "uplift"}
        What its combinations are for.
    adverse, helpful : float
        Factors of permanent cases where they are adverse and where they help.
    variable : float
        Factor of variable cases where they are adverse; 0 where they help.
    source : str
        Where they come from.
    """

    label: str
    purpose: Purpose
    adverse: float
    helpful: float
    variable: float
    source: str


PRESETS = {
    "EN 1990 STR": Preset(
        label="STR",
        purpose="strength",
        adverse=1.35,
        helpful=1.00,
        variable=1.50,
        source="EN 1990, set STR; no psi factors",
    ),
    "EN 1990 EQU": Preset(
        label="EQU",
        purpose="uplift",
        adverse=1.10,
        helpful=0.90,
        variable=1.50,
        source="EN 1990, set EQU; no psi factors",
    ),
    "EN 1990 characteristic": Preset(
        label="char.",
        purpose="service",
        adverse=1.00,
        helpful=1.00,
        variable=1.00,
        source="EN 1990, characteristic, from memory: check; no psi factors",
    ),
}


def preset_combinations(
    preset: str, *, permanent: Sequence[str] = (), variable: Sequence[str] = ()
) -> tuple[Combination, ...]:
    """Combinations of a code, every choice of adverse and helpful cases.

    Parameters
    ----------
    preset : str
        A key of `PRESETS`, such as "EN 1990 STR".
    permanent : sequence of str, optional
        Cases that always act; all have one factor, as actions of one source.
    variable : sequence of str, optional
        Cases that act or do not, each in full.

    Returns
    -------
    tuple of Combination

    Raises
    ------
    InputError
        If there is no such preset, or no case.

    Examples
    --------
    >>> for c in preset_combinations("EN 1990 EQU", permanent=["g"], variable=["q"]):
    ...     print(f"{c.name}: {c.words}")
    EQU 1: 1.1 g
    EQU 2: 0.9 g
    EQU 3: 1.1 g + 1.5 q
    EQU 4: 0.9 g + 1.5 q
    """
    if preset not in PRESETS:
        raise InputError(
            f"there is no preset {preset!r}; the presets are {', '.join(PRESETS)}."
        )
    own = PRESETS[preset]
    if not permanent and not variable:
        raise InputError(f"preset {preset} has no cases; name permanent or variable.")
    found: list[Combination] = []
    always = dict.fromkeys((own.adverse, own.helpful)) if permanent else {1.0: None}
    for acting in itertools.product((0.0, own.variable), repeat=len(variable)):
        for factor in always:
            factors = {
                **dict.fromkeys(permanent, factor),
                **dict(zip(variable, acting, strict=True)),
            }
            if any(factors.values()):
                found.append(
                    Combination(
                        name=f"{own.label} {len(found) + 1}",
                        factors=factors,
                        purpose=own.purpose,
                        source=own.source,
                    )
                )
    return tuple(found)


def expanded(
    cases: Sequence[Case], combinations: Sequence[Combination]
) -> tuple[Combination, ...]:
    """What is judged: each combination with every sign of the cases that reverse.

    Parameters
    ----------
    cases : sequence of Case
        The load cases.
    combinations : sequence of Combination
        As stated; where there are none, each case stands for itself if some case
        reverses, for every purpose.

    Returns
    -------
    tuple of Combination
        Empty where there are no combinations and no case reverses: the cases are
        judged as they are.

    Raises
    ------
    InputError
        If a combination names a case that is not there, two have one name, or there
        are too many.
    """
    names = [case.name for case in cases]
    reversing = {case.name for case in cases if case.reverses}
    stated = list(combinations)
    if not stated:
        if not reversing:
            return ()
        stated = [
            Combination(name=name, factors={name: 1.0}, purpose="every")
            for name in names
        ]
    found: list[Combination] = []
    for combination in stated:
        for case in combination.factors:
            if case not in names:
                raise InputError(
                    f"combination {combination.name!r} names case {case!r}; the cases "
                    f"are {', '.join(names)}."
                )
        both = [c for c, f in combination.factors.items() if f and c in reversing]
        for signs in itertools.product((1.0, -1.0), repeat=len(both)):
            turned = [c for c, sign in zip(both, signs, strict=True) if sign < 0.0]
            factors = dict(combination.factors)
            factors |= {case: -factors[case] for case in turned}
            name = combination.name
            if turned == [name]:
                name += " reversed"
            elif turned:
                name += f", {' and '.join(turned)} reversed"
            found.append(replace(combination, name=name, factors=factors))
        if len(found) > MOST:
            raise InputError(
                f"there are more than {MOST} combinations, those of both signs "
                "included; state those that may govern."
            )
    known = [combination.name for combination in found]
    for name in known:
        if known.count(name) > 1:
            raise InputError(
                f"{known.count(name)} combinations are called {name!r}; each needs a "
                "name of its own."
            )
    return tuple(found)


def factor_table(cases: Sequence[Case], combinations: Sequence[Combination]) -> Floats:
    """Factors on cases, (n_cases, n_combinations)."""
    return np.array(
        [[c.factors.get(case.name, 0.0) for c in combinations] for case in cases],
        dtype=np.float64,
    ).reshape(len(cases), len(combinations))


def combined_cases(
    cases: Sequence[Case], combinations: Sequence[Combination]
) -> tuple[Case, ...]:
    """Each combination as one load case, with all its loads times their factors."""
    return tuple(
        Case(
            name=combination.name,
            loads=[
                scaled(load, combination.factors[case.name])
                for case in cases
                if combination.factors.get(case.name, 0.0)
                for load in case.loads
            ],
        )
        for combination in combinations
    )


@dataclass(frozen=True)
class _Times:
    """A function of x and y times a factor."""

    function: object
    factor: float

    def __call__(self, x: Floats, y: Floats) -> Floats:
        values: Floats = self.factor * self.function(x, y)  # type: ignore[operator]
        return values


def scaled(load: Load, factor: float) -> Load:
    """A load times a factor; a negative one reverses it."""
    match load:
        case Pressure(value=value):
            return replace(load, value=factor * value)
        case Hydrostatic(specific_weight=weight):
            return replace(load, specific_weight=factor * weight)
        case PressureField(function=function):
            return PressureField(_Times(function, factor))
        case PointMoment(moment=(about_x, about_y)):
            return replace(load, moment=(factor * about_x, factor * about_y))
        case EdgeMoment(moment=moment):
            return replace(load, moment=factor * moment)
        case SelfWeight(acceleration=acceleration):
            return replace(load, acceleration=factor * acceleration)
        case RectanglePatch() | DiscPatch() | PointForce() | LineForce():
            return cast(Load, replace(load, force=factor * load.force))
