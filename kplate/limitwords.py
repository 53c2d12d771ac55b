"""Limits and combinations in words: what was stated, with where it comes from."""

from kplate.judging import Judged
from kplate.limits import (
    DeflectionLimit,
    Limit,
    ReactionLimit,
    StepLimit,
    StressLimit,
    StressRangeLimit,
)
from kplate.panel import Panel

MOST = 100  # characters of a line that a screen and an e-mail hold


def stated_lines(panel: Panel) -> list[str]:
    """Material, limits and combinations as they were stated."""
    material = panel.plate.material
    words = [f"{material.name}: E {material.E / 1e9:.6g} GPa, nu {material.nu:g}"]
    words += [limit_words(panel, limit) for limit in panel.limits]
    held = {True: "yes", False: "no", None: "not stated"}[panel.held_in_plane]
    words.append(f"held in plane: {held}")
    lines = [words[0]]
    for word in words[1:]:
        if len(lines[-1]) + len(word) + 2 > MOST:
            lines.append(word)
        else:
            lines[-1] += f"; {word}"
    return lines


def limit_words(panel: Panel, limit: Limit) -> str:
    """One limit in the panel's units, with its source."""
    units = panel.units
    source = limit.source
    if limit.words.endswith(source.partition(";")[0]):  # a name that says it already
        source = source.partition("; ")[2]
    how = ", ".join(filter(None, (limit.words, source)))
    match limit:
        case DeflectionLimit(at_most=most):
            words = f"deflection at most {units.deflection.show(most)}"
        case StepLimit(at_most=most):
            words = f"{limit.quantity} at most {units.deflection.show(most)}"
        case StressLimit(criterion=criterion, factor=factor):
            strength = limit.strength_at(float(panel.plate.thicknesses.max()))
            words = f"{criterion} at most {units.stress.show(strength)} / {factor:g}"
        case StressRangeLimit(at_most=most):
            words = f"{limit.quantity} at most {units.stress.show(most)}"
        case ReactionLimit(at=at, at_most=most):
            unit = units.line_force if at == "sides" else units.force
            words = f"{limit.quantity} at most {unit.show(most)}"
    return f"{words} ({how})" if how else words


def combination_lines(judged: Judged) -> list[str]:
    """The combinations that are judged, purpose by purpose, with factors and source.

    Where nothing but signs is combined there is nothing to say.
    """
    lines = []
    sources = dict.fromkeys(own.source for own in judged.combinations if own.source)
    for purpose in ("strength", "service", "uplift"):
        own = [each for each in judged.combinations if each.purpose == purpose]
        if not own:
            continue
        line = f"{purpose}:"
        for each in own:
            word = f" {each.name} = {each.words};"
            if len(line) + len(word) > MOST:
                lines.append(line)
                line = "   "
            line += word
        lines.append(line.removesuffix(";"))
    return lines + [f"factors: {source}" for source in sources]
