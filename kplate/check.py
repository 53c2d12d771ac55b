"""One public function for each command: solve, judge, write."""

from collections.abc import Iterator
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np

from kplate.adapt import default_goals, no_bands, solve
from kplate.choice import TRIANGLES, choose
from kplate.describe import describe
from kplate.errors import InputError
from kplate.files import replacing
from kplate.goals import Deflection
from kplate.limits import Outcome, Verdict, governing
from kplate.output.picture import write_picture
from kplate.output.record import solution_record, write_json, write_reactions
from kplate.output.tables import Line, legend, reactions_table, values_table
from kplate.output.vtk import write_vtk
from kplate.panel import Panel, read_panel
from kplate.reactions import CornerForce
from kplate.solution import Solution
from kplate.solve.static import Progress
from kplate.supports import Support
from kplate.validity import FLAG, Validity, validity
from kplate.values import Value

CAUTION = (
    "Not checked: welds, bolts, the frame, fatigue, impact, buckling. Results are for "
    "a qualified\nengineer's judgement; local codes and licensed practice decide."
)
ROUND_OFF = 1e-9  # share of the sum of magnitudes below which a total is none
SLIGHT = 0.01  # share of the largest line reaction below which uplift is not listed


@dataclass(frozen=True, eq=False, kw_only=True)
class Checked:
    """A panel file, solved and judged.

    Parameters
    ----------
    panel : Panel
        What was read.
    solution : Solution
        What was solved.
    lines : tuple of Line
        The numbers of the table.
    verdict : Verdict
        The judgement.
    validity : Validity
        Whether the theory holds.
    files : tuple of Path
        What was written.
    """

    panel: Panel
    solution: Solution
    lines: tuple[Line, ...]
    verdict: Verdict
    validity: Validity
    files: tuple[Path, ...] = ()

    @property
    def status(self) -> int:
        """Exit status: 0 for every form of pass, 1 for fails and not proven."""
        return 0 if self.verdict.outcome is Outcome.PASSES else 1

    @property
    def text(self) -> str:
        """What the command prints."""
        parts = [
            "\n".join(_heading(self.panel)),
            values_table(self.lines),
            reactions_table(_supports(self.solution), self.panel.units),
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
        (.json), reactions (.csv) and a picture (.png) under the panel file's name;
        nothing is written if left out.
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
    panel = read_panel(path)
    criterion = panel.limits.stress.criterion if panel.limits.stress else "von Mises"
    solution = solve(
        panel.plate,
        panel.cases,
        triangles=panel.triangles,
        element=panel.element,
        tolerance=panel.tolerance if panel.triangles is None else None,
        goals=default_goals(panel.plate, criterion),
        progress=progress,
    )
    lines = tuple(_lines(panel, solution))
    judgements = tuple(j for line in lines if (j := line.judgement) is not None)
    places = {excluded.place for excluded in solution.excluded}
    if panel.limits.stress is None:
        places = set()
    if panel.limits.hold_down is not None:
        places |= {
            corner.corner.place
            for case in solution.cases
            for corner in solution.reactions(case=case).corners
            if np.isnan(corner.force.value)
        }
    found = validity(solution, held_in_plane=panel.held_in_plane)
    verdict = Verdict(
        judgements=judgements,
        to_judge=len(places),
        flagged=not found.holds,
    )
    checked = Checked(
        panel=panel,
        solution=solution,
        lines=lines,
        verdict=verdict,
        validity=found,
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


def version() -> str:
    """Version of the installed package."""
    from importlib import metadata  # which takes long to import

    return metadata.version("kplate")


def _heading(panel: Panel) -> list[str]:
    """Identity, and the panel as it was understood."""
    plate, length = panel.plate, panel.units.length
    title = f"{panel.name}, {_thickness(panel)} {plate.material.name}"
    if panel.revision:
        title += f", revision {panel.revision}"
    lines = [
        f"{title}   input {panel.digest}, kplate {version()}",
        describe(plate.outline, mass=plate.mass, unit=length),
    ]
    by_support: dict[Support, list[str]] = {}
    for name in plate.outline.names:
        by_support.setdefault(plate.support(name), []).append(name)
    lines += [
        f"{support.name} ({support.words}): {', '.join(names)}"
        for support, names in by_support.items()
    ]
    lines += [
        f"zone {name}: {_short(h, panel.units.deflection.size)} "
        f"{panel.units.deflection.symbol} {material.name}"
        for name, (h, material) in zip(
            plate.outline.zone_names, plate.sections[1:], strict=True
        )
    ]
    others = {m.name for _, m in plate.sections} - {plate.material.name}
    if others and panel.limits.stress is not None:
        lines.append(
            f"the stress limit is that of {plate.material.name}; it is held against "
            f"zones of {', '.join(sorted(others))} alike"
        )
    lines += panel.notes
    bends = _bends(panel)
    if bends:
        degrees = np.degrees(plate.bend_turn)
        lines.append(
            f"bends, turning less than {degrees:.3g} degrees, taken with one tangent: "
            f"{', '.join(bends)} {length.symbol}"
        )
    lines += _stated(panel)
    return lines


def _stated(panel: Panel) -> list[str]:
    """Material and limits as they were stated."""
    material, units = panel.plate.material, panel.units
    words = [f"{material.name}: E {material.E / 1e9:.6g} GPa, nu {material.nu:g}"]
    limits = panel.limits
    if limits.deflection is not None:
        how = f" ({limits.deflection.words})" if limits.deflection.words else ""
        most = units.deflection.show(limits.deflection.at_most)
        words.append(f"deflection at most {most}{how}")
    if limits.stress is not None:
        strength = units.stress.show(limits.stress.strength)
        words.append(
            f"{limits.stress.criterion} at most {strength} / {limits.stress.factor:g}"
        )
    held = {True: "yes", False: "no", None: "not stated"}[panel.held_in_plane]
    words.append(f"held in plane: {held}")
    return ["; ".join(words)]


def _bends(panel: Panel) -> list[str]:
    """Vertices between sides held alike that count as bends."""
    plate, size = panel.plate, panel.units.length.size
    places = []
    for line in plate.outline.boundaries:
        for i, (x, y) in enumerate(line.points):
            before, after = (
                plate.support(line.sides[i - 1]),
                plate.support(line.sides[i]),
            )
            if (
                before == after
                and before.holds_deflection
                and not line.straight[i]
                and abs(line.turns[i]) < plate.bend_turn
            ):
                places.append(_place((float(x), float(y)), size))
    return places


def _lines(panel: Panel, solution: Solution) -> Iterator[Line]:
    """Numbers of the table, case by case."""
    for case in solution.cases:
        yield from _case_lines(panel, solution, case)


def _case_lines(panel: Panel, solution: Solution, case: str) -> Iterator[Line]:
    units, limits = panel.units, panel.limits
    size = units.length.size
    deflection = solution.peak("deflection", case=case)
    limit = limits.deflection.at_most if limits.deflection is not None else None
    way = "up" if deflection.value > 0.0 else "down"
    yield Line(
        case=case,
        quantity="peak deflection",
        value=deflection,
        unit=units.deflection,
        limit=limit,
        where=f"{_at(deflection, panel)}, {way}",
    )
    there = _deflection_there(solution, case)
    if there is not None:
        yield Line(
            case=case,
            quantity="deflection there",
            value=there,
            unit=units.deflection,
            where=_at(there, panel),
        )
    criterion = limits.stress.criterion if limits.stress is not None else "von Mises"
    stress = solution.peak(criterion, case=case)
    yield Line(
        case=case,
        quantity=f"peak {criterion}",
        value=stress,
        unit=units.stress,
        limit=limits.stress.at_most if limits.stress is not None else None,
        where=_at(stress, panel) + (f", {stress.face}" if stress.face else ""),
    )
    reactions = solution.reactions(case=case)
    total = reactions.total.force
    if abs(total) < ROUND_OFF * reactions.magnitude:
        total = 0.0
    yield Line(
        case=case,
        quantity="total reaction",
        value=_exact(total, solution, case),
        unit=units.force,
        where=f"supports push {'up' if total > 0.0 else 'down'}" if total else "",
    )
    pull, forces = solution.hold_down(case=case)
    if forces or pull.reason or limits.hold_down is not None:
        words = [_corner_words(solution, forces, case, size)] if forces else []
        where = "; ".join([*words, *([pull.reason] if pull.reason else [])])
        yield Line(
            case=case,
            quantity="corner hold-down",
            value=pull,
            unit=units.force,
            limit=limits.hold_down,
            where=where or "none needed",
        )
    points = [p for p in solution.reactions(case=case).points if p.force.value < 0.0]
    for point in points:
        yield Line(
            case=case,
            quantity=f"{point.mark} hold-down",
            value=-point.force,
            unit=units.force,
            limit=limits.hold_down,
            where=f"{_at(point.force, panel)}",
        )
    uplift, side = solution.side_uplift(case=case)
    if uplift.value > SLIGHT * _largest_line_reaction(solution, case):
        yield Line(
            case=case,
            quantity="side hold-down",
            value=uplift,
            unit=units.line_force,
            where=f"{side} at {_at(uplift, panel)}",
        )


def _deflection_there(solution: Solution, case: str) -> Value | None:
    """Bound of the deflection at the vertex that deflects most, if there is one."""
    own = [
        value
        for (goal, name), value in solution.known.items()
        if name == case and isinstance(goal, Deflection) and value.value != 0.0
    ]
    return max(own, key=lambda value: abs(value.value), default=None)


def _exact(total: float, solution: Solution, case: str) -> Value:
    """All supports' force, which balances the loads, whatever the mesh."""
    if solution.dual is None:
        return Value(value=total, case=case)
    off = 1e-9 * abs(total)
    return Value(
        value=total, case=case, lower=total - off, upper=total + off, kind="bound"
    )


def _largest_line_reaction(solution: Solution, case: str) -> float:
    sides = solution.reactions(case=case).sides
    sizes = [np.nanmax(np.abs(side.line_reaction), initial=0.0) for side in sides]
    return float(max(sizes, default=0.0))


def _supports(
    solution: Solution,
) -> list[tuple[str, str, Value, float, float]]:
    """What each side, seam and point support brings, case by case."""
    rows = []
    for case in solution.cases:
        reactions = solution.reactions(case=case)
        for side in reactions.sides:
            known = side.line_reaction[~np.isnan(side.line_reaction)]
            ends = (
                (float(known.min()), float(known.max()))
                if known.size
                else (np.nan,) * 2
            )
            force = solution.resultant(side.side, case=case)
            rows.append((case, side.side, force, *ends))
        rows += [
            (case, point.mark, point.force, np.nan, np.nan)
            for point in reactions.points
        ]
    return rows


def _corner_words(
    solution: Solution, forces: list[CornerForce], case: str, size: float
) -> str:
    """Which corners need the largest pull."""
    known = [
        f for f in solution.reactions(case=case).corners if not np.isnan(f.force.value)
    ]
    if len(forces) > 2 and len(forces) == len(known):
        counts = {3: "three", 4: "four"}
        return f"all {counts.get(len(forces), len(forces))} corners"
    return ", ".join(_place(f.corner.place, size) for f in forces)


def _closing(checked: Checked) -> list[str]:
    """Verdict, remarks, what was left out, balance and caution."""
    panel, solution = checked.panel, checked.solution
    length = panel.units.length
    flags = [word for word in checked.validity.words if word.startswith(FLAG)]
    plain = [word for word in checked.validity.words if word not in flags]
    lines = ["   ".join([f"{checked.verdict.words}.", *plain]), *flags]
    worst = governing(checked.verdict.judgements)
    if worst is not None:
        lines.append(
            f"governs: {worst.quantity}, case {worst.value.case}, used {worst.used:.2f}"
        )
    for excluded in solution.excluded:
        only = f", case {excluded.case}" if excluded.case else ""
        place, radius = (
            _place(excluded.place, length.size),
            _short(excluded.radius, length.size),
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
            f"balance of {case}: loads {_signed(reactions.load.force, panel)}, "
            f"supports {_signed(reactions.total.force, panel)}, force and moments to "
            f"{max(reactions.imbalance, 1e-16):.0e}"
        )
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
    if not solution.reached:
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
    panel, solution = checked.panel, checked.solution
    name = panel.path.stem
    targets = [f"{name}.png", f"{name}.vtu", f"{name}.json", f"{name}-reactions.csv"]
    for target in targets:
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
    record = solution_record(solution, version())
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
        "validity": checked.validity.words,
        "judgements": [
            {
                "case": j.value.case,
                "quantity": j.quantity,
                "value": None if np.isnan(j.value.value) else j.value.value,
                "limit": j.limit,
                "used": None if np.isnan(j.used) else j.used,
                "outcome": j.outcome.name.lower().replace("_", " "),
            }
            for j in checked.verdict.judgements
        ],
    }
    worst = solution.peak("deflection").case
    picture = write_picture(
        solution,
        out / f"{name}.png",
        case=worst,
        units=panel.units,
        title=f"{panel.name}, {_thickness(panel)} {panel.plate.material.name}",
    )
    return (
        write_vtk(solution, out / f"{name}.vtu"),
        write_json(record, out / f"{name}.json"),
        write_reactions(solution, out / f"{name}-reactions.csv"),
        picture,
    )


def _thickness(panel: Panel) -> str:
    unit = panel.units.deflection
    return f"{_short(panel.plate.thickness, unit.size)} {unit.symbol}"


def _at(value: Value, panel: Panel) -> str:
    if value.place is None:
        return value.reason
    return f"{_place(value.place, panel.units.length.size)} {panel.units.length.symbol}"


def _place(place: tuple[float, float], size: float) -> str:
    """A place to four digits of the unit of length."""
    return f"({_short(place[0], size, 4)}, {_short(place[1], size, 4)})"


def _short(value: float, size: float, digits: int = 6) -> str:
    shown = value / size
    return f"{0.0 if abs(shown) < 1e-6 else shown:.{digits}g}"


def _signed(force: float, panel: Panel) -> str:
    return f"{force / panel.units.force.size:+.6g} {panel.units.force.symbol}"
