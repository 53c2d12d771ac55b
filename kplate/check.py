"""One public function for each command: solve, judge, write."""

from dataclasses import asdict, dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np

from kplate.adapt import default_goals, no_bands, solve
from kplate.answers import NO_BAND
from kplate.asklines import asked_rows, asked_unit
from kplate.checklines import (
    criteria,
    extremes_rows,
    place_words,
    short,
    signed,
    support_rows,
    table_lines,
)
from kplate.choice import TRIANGLES, choose
from kplate.errors import InputError
from kplate.files import replacing
from kplate.goals import Peak
from kplate.heading import heading, thickness_words, version
from kplate.independent import Independent, independent
from kplate.judging import Judged, judgements, to_judge
from kplate.limits import (
    DeflectionLimit,
    Judgement,
    Outcome,
    ReactionLimit,
    StepLimit,
    Verdict,
    governing,
)
from kplate.limitwords import combination_lines, limit_words
from kplate.output.asked import write_asked, write_line_plot
from kplate.output.forcerows import write_reactions
from kplate.output.picture import write_picture
from kplate.output.record import (
    case_record,
    solution_record,
    write_json,
)
from kplate.output.tables import (
    Line,
    asked_table,
    extremes_table,
    legend,
    reactions_table,
    values_table,
)
from kplate.output.vtk import write_vtk
from kplate.panel import Panel, read_panel
from kplate.placing import Placed, placed
from kplate.solution import Solution
from kplate.solve.static import Progress
from kplate.validity import FLAG, Validity, validity
from kplate.woodarmer import DESIGN

CAUTION = (
    "Not checked: welds, bolts, the frame, fatigue, impact, buckling. Results are for "
    "a qualified\nengineer's judgement; local codes and licensed practice decide."
)


@dataclass(frozen=True, eq=False, kw_only=True)
class Checked:
    """A panel file, solved and judged.

    Parameters
    ----------
    panel : Panel
        What was read.
    solution : Solution
        What was solved, in its load cases.
    judged : Judged
        What was judged: the cases, or their combinations.
    lines : tuple of Line
        The numbers of the table.
    verdict : Verdict
        The judgement.
    validity : Validity
        Whether the theory holds.
    placed : Placed
        Where roaming patches were set down.
    independent : tuple
        Each case's name and what formulas say beside it.
    files : tuple of Path
        What was written.
    """

    panel: Panel
    solution: Solution
    judged: Judged
    lines: tuple[Line, ...]
    verdict: Verdict
    validity: Validity
    placed: Placed
    independent: tuple[tuple[str, tuple[Independent, ...]], ...] = ()
    files: tuple[Path, ...] = ()

    @property
    def status(self) -> int:
        """Exit status: 0 for every form of pass, 1 for fails and not proven."""
        return 0 if self.verdict.outcome is Outcome.PASSES else 1

    @property
    def text(self) -> str:
        """What the command prints."""
        what, units = "case", self.panel.units
        supports = reactions_table(support_rows(self.solution), units)
        if self.judged.combinations:
            what = "combination"
            supports = extremes_table(extremes_rows(self.judged, units), units)
        parts = [
            "\n".join([*heading(self.panel), *combination_lines(self.judged)]),
            values_table(self.lines, what),
            asked_table(asked_rows(self.panel, self.judged), what),
            supports,
            "\n".join(_closing(self)),
        ]
        return "\n\n".join(part for part in parts if part)


def check(
    path: Path, *, out: Path | None = None, progress: Progress | None = None
) -> Checked:
    """Solve a panel file, judge it and write the results.

    Parameters
    ----------
    path : Path
        The panel file.
    out : Path, optional
        Directory for the results, made where it is missing: fields (.vtu), record
        (.json), reactions (.csv), a picture (.png), what was asked for (.csv) and
        lines drawn (.png) under the panel file's name; nothing is written if left out.
    progress : callable, optional
        Called with a stage and the fraction done.

    Returns
    -------
    Checked

    Raises
    ------
    InputError
        If the file cannot be read or states something wrong, or a result cannot be
        written.
    MeshError, SolveError
        If the panel cannot be meshed or solved.
    """
    where = placed(read_panel(path), progress=progress)
    panel = where.panel
    goals = default_goals(panel.plate, *criteria(panel))
    goals += tuple(goal for ask in panel.asks for goal in ask.goals)
    if panel.design:
        goals = (*goals, *(Peak(quantity=quantity) for quantity in DESIGN))
    solution = solve(
        panel.plate,
        panel.cases,
        triangles=panel.triangles,
        element=panel.element,
        tolerance=panel.tolerance if panel.triangles is None else None,
        goals=goals,
        combinations=panel.combinations,
        progress=progress,
    )
    judged = Judged.of(solution, panel.combinations)
    found_judgements = judgements(judged, panel.limits)
    lines = tuple(table_lines(panel, judged, found_judgements))
    found = validity(judged.solution, held_in_plane=panel.held_in_plane)
    verdict = Verdict(
        judgements=found_judgements,
        to_judge=to_judge(judged, panel.limits),
        flagged=not found.holds,
    )
    checked = Checked(
        panel=panel,
        solution=solution,
        judged=judged,
        lines=lines,
        verdict=verdict,
        validity=found,
        placed=where,
        independent=tuple((c, independent(solution, case=c)) for c in solution.cases),
    )
    if out is None:
        return checked
    return replace(checked, files=_write(checked, out))


def new_panel(path: Path) -> Path:
    """Write a starter panel file with every section and a comment on each line.

    Raises
    ------
    InputError
        If the file exists already or cannot be written.
    """
    if path.exists():
        raise InputError(
            f"{path} exists already; choose another name, or remove it first."
        )
    from importlib import resources

    text = resources.files("kplate").joinpath("starter.toml").read_text("utf-8")
    with replacing(path) as temporary:
        temporary.write_text(text, encoding="utf-8")
    return path


def _closing(checked: Checked) -> list[str]:
    """Verdict, remarks, what was left out, balance and caution."""
    panel, solution = checked.panel, checked.solution
    length = panel.units.length
    flags = [word for word in checked.validity.words if word.startswith(FLAG)]
    plain = [word for word in checked.validity.words if word not in flags]
    lines = ["   ".join([f"{checked.verdict.words}.", *plain]), *flags]
    worst = governing(checked.verdict.judgements)
    if worst is not None:
        what = "combination" if checked.judged.combinations else "case"
        case = f", {what} {worst.value.case}" if worst.value.case else ""
        lines.append(f"governs: {worst.quantity}{case}, used {worst.used:.2f}")
    for excluded in solution.excluded:
        only = f", case {excluded.case}" if excluded.case else ""
        place, radius = (
            place_words(excluded.place, length.size),
            short(excluded.radius, length.size),
        )
        lines.append(
            f"left out of peaks and line reactions: {place} {length.symbol}{only}, "
            f"radius {radius} {length.symbol}: {excluded.reason}"
        )
    for case, forces in zip(solution.cases, solution.state.forces.T, strict=True):
        reactions = solution.reactions(case=case)
        if not forces.any():
            lines.append(f"case {case} brings no load on the panel")
            continue
        lines.append(
            f"balance of {case}: loads {signed(reactions.load.force, panel)}, "
            f"supports {signed(reactions.total.force, panel)}, force and moments to "
            f"{max(reactions.imbalance, 1e-16):.0e}"
        )
    lines += checked.placed.words
    for case, formulas in checked.independent:
        shown = [own.words(length, panel.units.deflection) for own in formulas]
        words = "; ".join(shown) or "no formula is near its plate and loads"
        lines.append(f"independent check of {case}: {words}")
    lines += _reached(panel, solution)
    mark = legend(checked.lines)
    triangles = len(solution.mesh.triangles)
    chosen = choose(panel.plate, panel.element, panel.triangles)
    asked = ""
    if not solution.history:
        asked = f" ({panel.triangles or TRIANGLES[chosen.element]} asked for)"
    because = f", as {chosen.reason}" if chosen.reason else ""
    lines.append(
        f"{triangles} triangles{asked}: {solution.state.element.name}{because}."
        f"{'   ' * bool(mark)}{mark}"
    )
    return [*lines, CAUTION]


def _reached(panel: Panel, solution: Solution) -> list[str]:
    """Whether the tolerance was reached, and what bands are worth."""
    if panel.tolerance is None:
        return []
    wanted = f"tolerance {100.0 * panel.tolerance:.3g} %"
    if not solution.history:
        why = "triangles are stated"
        if not panel.triangles:
            element = choose(panel.plate, panel.element).element
            why = no_bands(panel.cases, element)
        return [f"{wanted}: not used, as {why}"]
    last = solution.history[-1]
    count = len(solution.history)
    meshes = "1 mesh" if count == 1 else f"{count} meshes"
    line = f"{wanted}: {'' if solution.reached else 'not '}reached"
    line += f", {last.unknowns} unknowns, {meshes}"
    if not last.bands:
        line = f"{wanted}: {NO_BAND}, {last.unknowns} unknowns, {meshes}"
    elif not solution.reached:
        widest = max(last.bands, key=lambda name: last.bands[name])
        line = f"tolerance not reached: {widest} {100.0 * last.bands[widest]:.2g} %"
        line += (
            f" of {100.0 * panel.tolerance:.3g} %, {last.unknowns} unknowns, {meshes}"
        )
    kinds = {
        value.reason for value in solution.known.values() if value.kind == "estimate"
    }
    return [line, *(f"no band is a bound: {reason}" for reason in sorted(kinds))]


def _write(checked: Checked, out: Path) -> tuple[Path, ...]:
    """Write fields, record, reactions and picture."""
    try:
        out.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        raise InputError(
            f"the directory {out} cannot be made ({error.strerror}); choose another "
            "with --out."
        ) from error
    panel, solution = checked.panel, checked.judged.solution
    name = panel.path.stem
    lines = [ask for ask in panel.asks if ask.is_line]
    drawn = [f"{name}-line-{k}.png" for k in range(1, len(lines) + 1)]
    targets = [f"{name}.png", f"{name}.vtu", f"{name}.json", f"{name}-reactions.csv"]
    asked = f"{name}-asked.csv"
    for target in [*targets, *([asked] if panel.asks else []), *drawn]:
        path = out / target
        if path.exists() and path.samefile(panel.path):
            raise InputError(
                f"the result {path} would replace the panel file itself; name the "
                "panel file .toml or choose another --out."
            )
        if path.is_dir():
            raise InputError(
                f"{path} is a directory; remove it or choose another --out."
            )
    worst = solution.peak("deflection").case
    picture = write_picture(
        solution,
        out / f"{name}.png",
        case=worst,
        units=panel.units,
        title=f"{panel.name}, {thickness_words(panel)} {panel.plate.material.name}",
    )
    files = [
        write_vtk(solution, out / f"{name}.vtu", design=panel.design),
        write_json(_record(checked), out / f"{name}.json"),
        write_reactions(solution, out / f"{name}-reactions.csv"),
        picture,
    ]
    if panel.asks:
        files.append(write_asked(solution, panel.asks, out / asked))
    files += [
        write_line_plot(
            solution,
            ask,
            out / target,
            length=panel.units.length,
            units=[asked_unit(quantity, panel.units) for quantity in ask.values],
            title=f"{panel.name}: {ask.name}",
        )
        for ask, target in zip(lines, drawn, strict=True)
    ]
    return tuple(files)


def _record(checked: Checked) -> dict[str, Any]:
    """The record of what was stated, found and judged."""
    panel, judged = checked.panel, checked.judged
    record = solution_record(judged.solution, version(), design=panel.design)
    record["statement"]["cases"] = [case_record(case) for case in panel.cases]
    record["combinations"] = [
        {
            "name": own.name,
            "purpose": own.purpose,
            "factors": dict(own.factors),
            "source": own.source,
        }
        for own in judged.combinations
    ]
    record["panel"] = {
        "name": panel.name,
        "revision": panel.revision,
        "author": panel.author,
        "input": panel.digest,
        "tolerance": panel.tolerance,
        "held in plane": panel.held_in_plane,
    }
    record["verdict"] = {
        "words": checked.verdict.words,
        "theory": checked.validity.state.words,
        "validity": checked.validity.words,
        "limits": [limit_words(panel, limit) for limit in panel.limits],
        "judgements": [
            {
                "case": j.value.case,
                "quantity": j.quantity,
                "value": None if np.isnan(j.value.value) else j.value.value,
                "limit": j.limit,
                "unit": _si_unit(j),
                "used": None if np.isnan(j.used) else j.used,
                "outcome": j.outcome.name.lower().replace("_", " "),
            }
            for j in checked.verdict.judgements
        ],
    }
    record["roaming"] = [
        {
            "case": own.roaming.name,
            "places": len(own.places),
            "step [m]": own.roaming.step,
            "on": own.roaming.zone,
            "solves": own.solves,
            "governing": [
                {"quantity": g.quantity, "place [m]": list(g.place)}
                | {"value": None if np.isnan(g.value.value) else g.value.value}
                for g in own.governing
            ],
        }
        for own in checked.placed.roamed
    ]
    record["independent"] = [
        asdict(own) | {"ratio": own.ratio, "agrees": own.agrees}
        for _, formulas in checked.independent
        for own in formulas
        if own.value
    ]
    return record


def _si_unit(judgement: Judgement) -> str:
    """Unit of a limit in the record."""
    match judgement.stated:
        case DeflectionLimit() | StepLimit():
            return "m"
        case ReactionLimit(at=where):
            return "N/m" if where == "sides" else "N"
    return "Pa"
