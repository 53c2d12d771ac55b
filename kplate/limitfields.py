"""The limits of a panel file, in SI units.

Each is a table or a list of tables. A preset of `kplate.presets` takes the place of the
numbers, and its source is shown with the result.
"""

import re
from collections.abc import Mapping
from typing import Any, cast

from kplate.errors import InputError
from kplate.fields import (
    Fields,
    named,
    refuse_beside,
    refuse_later,
    several,
    some,
    within,
)
from kplate.limits import (
    COMPONENTS,
    CRITERIA,
    Component,
    Criterion,
    DeflectionLimit,
    Limit,
    ReactionLimit,
    Sense,
    StepLimit,
    StressLimit,
    StressRangeLimit,
    Where,
)
from kplate.outline import Outline
from kplate.plate import Plate
from kplate.presets import DEFLECTIONS, FACTORS, STEPS, STRENGTHS, DeflectionPreset
from kplate.quantities import positive, stated_unit
from kplate.units import Unit

LIMITS = {
    "deflection": '{ span = "600 mm", at_most = "span/200" }',
    "step": '{ along = "north", at_most = "4 mm" }',
    "stress": '{ criterion = "von Mises", strength = "235 MPa", factor = 1.5 }',
    "stress_range": '{ of = "stress xx", at_most = "80 MPa" }',
    "hold_down": '"200 N"',
    "bearing": '{ sides = "2 kN/m" }',
    "stock": '["6 mm", "8 mm", "10 mm"]',
    "under_tolerance": '"0.3 mm"',
    "corrosion": '"1 mm"',
}
DEFLECTION = {
    "span": '"600 mm"',
    "cantilever": '"300 mm"',
    "at_most": '"span/200"',
    "preset": '"walkway ISO 14122-2"',
}
STEP = {"along": '"north"', "at_most": '"4 mm"', "preset": '"walkway ISO 14122-2"'}
STRESS = {
    "criterion": '"von Mises"',
    "strength": '"235 MPa"',
    "factor": "1.5",
    "preset": '"steel S235 EN 10025-2"',
}
RANGE = {"of": '"stress xx"', "at_most": '"80 MPa"'}
REACTION = {
    "corners": '"200 N"',
    "sides": '"2 kN/m"',
    "points": '"1 kN"',
    "only": '["east"]',
}
LATER_LIMITS = ("frequency",)

_SHARE = re.compile(r"span ?/ ?([0-9]{1,6}(?:\.[0-9]{1,6})?)")


def read_limits(
    table: Mapping[str, Any], plate: Plate
) -> tuple[tuple[Limit, ...], tuple[float, ...], Unit | None]:
    """Limits, the stock thicknesses in m, and the unit in which strength is stated."""
    refuse_later("[limits]", table, LATER_LIMITS)
    fields = Fields(where="[limits]", table=table, examples=LIMITS)
    outline = plate.outline
    limits: list[Limit] = []
    shown_in = None
    if "deflection" in fields:
        rows = several(fields, "deflection", DEFLECTION)
        limits += [_deflection(row, outline) for row in rows]
    if "step" in fields:
        limits += [_step(row, outline) for row in several(fields, "step", STEP)]
    for row in several(fields, "stress", STRESS) if "stress" in fields else ():
        limit, unit = _stress(row)
        limits.append(limit)
        shown_in = shown_in or unit
    if "stress_range" in fields:
        limits += [_range(row) for row in several(fields, "stress_range", RANGE)]
    for key, sense in (("hold_down", "hold-down"), ("bearing", "bearing")):
        if key in fields:
            limits += _reactions(fields, key, cast(Sense, sense), plate)
    stock = []
    for place, item in fields.items("stock") if "stock" in fields else ():
        with within(place):
            stock.append(positive(item, "length"))
    return tuple(dict.fromkeys(limits)), tuple(stock), shown_in


def read_allowances(table: Mapping[str, Any]) -> tuple[float, float]:
    """What a plate may lack of its nominal thickness in m: as rolled, by corrosion."""
    fields = Fields(where="[limits]", table=table, examples=LIMITS)
    under, corrosion = (
        fields.positive(name, "length") if name in fields else 0.0
        for name in ("under_tolerance", "corrosion")
    )
    return under, corrosion


def _deflection(fields: Fields, outline: Outline) -> DeflectionLimit:
    """Read a share of a span, a length, or a list of them: the least counts."""
    if "preset" in fields:
        refuse_beside(fields, "preset", ("at_most",))
        preset = DEFLECTIONS[fields.choice("preset", DEFLECTIONS)]
        return _preset_deflection(fields, preset, outline)
    stated = fields.value("at_most")
    places = [(fields.place("at_most"), stated)]
    if isinstance(stated, list):
        places = fields.items("at_most")
    lengths = []
    for place, text in places:
        with within(place):
            part = _part_of_span(text)
            lengths.append(positive(text, "length") if part is None else part)
    shares = [_part_of_span(text) is not None for _, text in places]
    if not any(shares):
        _refuse_span(fields, "at_most")
        return DeflectionLimit(at_most=min(lengths), words=_words(places))
    span, how = _span(fields, outline)
    lengths = [
        length * span if is_share else length
        for length, is_share in zip(lengths, shares, strict=True)
    ]
    return DeflectionLimit(at_most=min(lengths), words=_words(places) + how)


def _words(places: list[tuple[str, Any]]) -> str:
    return " and ".join(text for _, text in places)


def _preset_deflection(
    fields: Fields, preset: DeflectionPreset, outline: Outline
) -> DeflectionLimit:
    lengths, words = [], []
    if preset.parts is not None:
        span, how = _span(fields, outline)
        lengths.append(span / preset.parts)
        words.append(f"span/{preset.parts:g}{how}")
    else:
        _refuse_span(fields, "preset")
    if preset.most is not None:
        lengths.append(preset.most)
        words.append(f"{1e3 * preset.most:g} mm")
    return DeflectionLimit(
        at_most=min(lengths), words=" and ".join(words), source=preset.source
    )


def _refuse_span(fields: Fields, key: str) -> None:
    for own in ("span", "cantilever"):
        if own in fields:
            raise fields.refuse(own, f"{key} does not use it; take it out.")


def _span(fields: Fields, outline: Outline) -> tuple[float, str]:
    """Span in m, and what it is in words where that is not plain: twice a cantilever.

    A length, or that of a side: "side north".
    """
    if "cantilever" in fields:
        refuse_beside(fields, "cantilever", ("span",))
        length, side = _length(fields, "cantilever", outline)
        stated = side or str(fields.value("cantilever"))
        return 2.0 * length, f", span twice the cantilever, {stated}"
    length, side = _length(fields, "span", outline)
    return length, f" of {side}" if side else ""


def _length(fields: Fields, key: str, outline: Outline) -> tuple[float, str]:
    """A length in m, and the side whose length it is, if it is one's."""
    stated = fields.value(key)
    if isinstance(stated, str) and stated.startswith("side "):
        name = stated.removeprefix("side ")
        if name not in outline.side_names:
            raise fields.refuse(
                key,
                f"there is no such side; the sides are {some(outline.side_names)}.",
            )
        return outline.side_length(name), f"side {name}"
    return fields.positive(key, "length"), ""


def _part_of_span(text: Any) -> float | None:
    """Read "span/200" as 1/200; ``None`` for what starts like a length."""
    if isinstance(text, str) and text[:1] in set("+-.0123456789"):
        return None
    match = _SHARE.fullmatch(text) if isinstance(text, str) else None
    if match is None or float(match[1]) < 1.0:
        raise InputError('it must be "span/200", say, or a length such as "3 mm".')
    return 1.0 / float(match[1])


def _step(fields: Fields, outline: Outline) -> StepLimit:
    along = named(fields, "along", outline.side_names, "side")
    if "preset" in fields:
        refuse_beside(fields, "preset", ("at_most",))
        preset = STEPS[fields.choice("preset", STEPS)]
        assert preset.most is not None
        return StepLimit(along=along, at_most=preset.most, source=preset.source)
    return StepLimit(along=along, at_most=fields.positive("at_most", "length"))


def _stress(fields: Fields) -> tuple[StressLimit, Unit | None]:
    """Read a stress limit, and the unit in which its strength is stated."""
    factor, source = _factor(fields)
    if "preset" in fields:
        refuse_beside(fields, "preset", ("strength",))
        name = fields.choice("preset", STRENGTHS)
        preset = STRENGTHS[name]
        criterion = preset.criterion
        if "criterion" in fields:
            criterion = cast(Criterion, fields.choice("criterion", CRITERIA))
        with within(fields.where):
            limit = StressLimit(
                criterion=criterion,
                strength=preset.grades[0][1],
                factor=factor,
                grades=preset.grades,
                words=name,
                source="; ".join(filter(None, (preset.source, source))),
            )
        return limit, None
    criterion = cast(Criterion, fields.choice("criterion", CRITERIA))
    strength = fields.positive("strength", "stress")
    shown_in = stated_unit(fields.value("strength"), "stress")
    with within(fields.where):
        limit = StressLimit(
            criterion=criterion, strength=strength, factor=factor, source=source
        )
    return limit, shown_in


def _factor(fields: Fields) -> tuple[float, str]:
    """Read a partial factor: a number, or that of a material by its name."""
    if isinstance(fields.value("factor"), str):
        name = fields.choice("factor", FACTORS)
        factor, source = FACTORS[name]
        return factor, f"factor of {name} {source}"
    return fields.number("factor"), ""


def _range(fields: Fields) -> StressRangeLimit:
    of = fields.choice("of", (*COMPONENTS, *CRITERIA))
    return StressRangeLimit(
        of=cast("Component | Criterion", of),
        at_most=fields.positive("at_most", "stress"),
    )


def _reactions(
    fields: Fields, key: str, sense: Sense, plate: Plate
) -> list[ReactionLimit]:
    """Read limits on what supports bring; one force holds for corners and marks."""
    held = [m.name for m in plate.outline.marks if plate.support(m.name).holds]
    if isinstance(fields.value(key), str):
        most = fields.positive(key, "force")
        where: list[Where] = ["corners", "points"] if held else ["corners"]
        return [ReactionLimit(at=at, sense=sense, at_most=most) for at in where]
    found = []
    for row in several(fields, key, REACTION):
        only = tuple(row.words("only")) if "only" in row else ()
        stated = [at for at in ("corners", "sides", "points") if at in row]
        if not stated:
            raise InputError(
                f"{row.where} states no limit; give one such as corners = "
                f"{REACTION['corners']}."
            )
        for at in stated:
            dimension = "line force" if at == "sides" else "force"
            most = row.positive(at, dimension)
            with within(row.where):
                found.append(
                    ReactionLimit(
                        at=cast(Where, at), sense=sense, at_most=most, only=only
                    )
                )
    return found
