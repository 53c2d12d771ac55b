"""Combinations of a panel file, and the points and lines it asks for."""

from collections.abc import Sequence
from typing import Any, cast

from kplate.asking import ASKED, MOST_STATIONS, Ask
from kplate.combinations import (
    PRESETS,
    Combination,
    Purpose,
    expanded,
    preset_combinations,
)
from kplate.errors import InputError
from kplate.fields import Fields, closest, named, numbered, shown, some, within
from kplate.goals import Place
from kplate.loads import Case
from kplate.outline import Outline
from kplate.quantities import bare_number
from kplate.units import Unit

COMBINATION = {
    "name": '"gust"',
    "purpose": '"uplift"',
    "factors": "{ weight = 0.9, wind = 1.5 }",
}
PRESET = {
    "preset": '"EN 1990 STR"',
    "permanent": '["weight"]',
    "variable": '["wheel"]',
}
STATED: tuple[Purpose, ...] = ("strength", "service", "uplift")
POINT = {
    "name": '"camera"',
    "at": "[400, 300]",
    "values": '["deflection", "m_xx"]',
}
LINE = {
    "name": '"centre line"',
    "from": "[0, 300]",
    "to": "[800, 300]",
    "stations": "21",
    "values": '["deflection", "m_xx"]',
}


def read_combinations(
    tables: Sequence[Any], cases: Sequence[Case]
) -> tuple[Combination, ...]:
    """Combinations of the load cases, as stated: signs are not chosen yet."""
    found: list[Combination] = []
    for i, table in enumerate(tables, 1):
        where = numbered("[[combination]]", i, table)
        if isinstance(table, dict) and "preset" in table:
            fields = Fields(where=where, table=table, examples=PRESET)
            preset = fields.choice("preset", PRESETS)
            acting = {
                key: _cases(fields, key, cases) if key in fields else []
                for key in ("permanent", "variable")
            }
            both = set(acting["permanent"]) & set(acting["variable"])
            if both:
                raise InputError(
                    f"{where}: {some(sorted(both))} cannot be permanent and variable; "
                    "keep one."
                )
            with within(where):
                found += preset_combinations(preset, **acting)
            continue
        fields = Fields(where=where, table=table, examples=COMBINATION)
        name = fields.word("name")
        purpose = cast(Purpose, fields.choice("purpose", STATED))
        factors = _factors(fields, cases)
        with within(where):
            found.append(Combination(name=name, factors=factors, purpose=purpose))
    with within("[[combination]]"):
        expanded(cases, found)
    return tuple(found)


def idle_cases(
    cases: Sequence[Case], combinations: Sequence[Combination]
) -> tuple[str, ...]:
    """A note on each case that acts in no combination, so that it is not judged."""
    acting = {
        name for own in combinations for name, factor in own.factors.items() if factor
    }
    idle = [case.name for case in cases if combinations and case.name not in acting]
    return tuple(f"case {name} is in no combination: not judged" for name in idle)


def _factors(fields: Fields, cases: Sequence[Case]) -> dict[str, float]:
    """Read a factor for each case that acts."""
    names = [case.name for case in cases]
    table = fields.value("factors")
    example = COMBINATION["factors"]
    if not isinstance(table, dict) or not table:
        raise fields.refuse("factors", f"it must be a table such as {example}.")
    factors = {}
    for name, value in table.items():
        place = f"{fields.where} factors: {name} = {shown(value)}"
        if name not in names:
            raise InputError(
                f"{place}: there is no such case; the cases are {some(names)}."
                f"{closest(name, names)}"
            )
        with within(place):
            factors[name] = bare_number(value)
    return factors


def _cases(fields: Fields, key: str, cases: Sequence[Case]) -> list[str]:
    """Read a list of cases."""
    names = [case.name for case in cases]
    stated = fields.words(key)
    for name in stated:
        if name not in names:
            raise fields.refuse(
                key,
                f"there is no case {name!r}; the cases are {some(names)}."
                f"{closest(name, names)}",
            )
        if stated.count(name) > 1:
            raise fields.refuse(key, f"it names {name!r} twice; once will do.")
    return stated


def read_asks(tables: Sequence[Any], outline: Outline, plain: Unit) -> tuple[Ask, ...]:
    """Points and lines where values are wanted; plain numbers are of the unit given."""
    found: dict[str, Ask] = {}
    for i, table in enumerate(tables, 1):
        where = numbered("[[ask]]", i, table)
        is_line = isinstance(table, dict) and ("from" in table or "to" in table)
        fields = Fields(where=where, table=table, examples=LINE if is_line else POINT)
        name = fields.word("name")
        if name in found:
            raise InputError(
                f"{where}: another point or line has this name; give each its own."
            )
        values = tuple(fields.words("values"))
        for value in values:
            if value not in ASKED:
                raise fields.refuse(
                    "values",
                    f"there is no value {value!r}; the values are "
                    f"{', '.join(ASKED)}.{closest(value, ASKED)}",
                )
        stations = 21
        if is_line:
            places: tuple[Place, ...] = (
                fields.pair("from", plain),
                fields.pair("to", plain),
            )
            if "stations" in fields:
                stations = _stations(fields)
        else:
            places = (_place(fields, outline, plain),)
        with within(where):
            ask = Ask(
                name=name,
                values=tuple(dict.fromkeys(values)),
                places=places,
                stations=stations,
            )
        for x, y in ask.points.tolist():
            if not outline.covers((x, y)):
                raise InputError(
                    f"{where}: ({x / plain.size:.6g}, {y / plain.size:.6g}) "
                    f"{plain.symbol} is not on the plate; move it."
                )
        found[name] = ask
    return tuple(found.values())


def _stations(fields: Fields) -> int:
    count = fields.value("stations")
    if isinstance(count, bool) or not isinstance(count, int):
        raise fields.refuse("stations", "it must be a whole number, without quotes.")
    if not 2 <= count <= MOST_STATIONS:
        raise fields.refuse("stations", f"it must lie between 2 and {MOST_STATIONS}.")
    return count


def _place(fields: Fields, outline: Outline, plain: Unit) -> Place:
    """A place, or that of a mark."""
    if isinstance(fields.value("at"), str):
        marks = {mark.name: mark.at for mark in outline.marks}
        return marks[named(fields, "at", marks, "mark")]
    return fields.pair("at", plain)
