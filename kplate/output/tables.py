"""What a command prints: tables that fit a screen and an e-mail."""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from io import StringIO

from kplate.limits import Judgement
from kplate.units import DisplayUnits, Unit
from kplate.values import Value

MARKS = {"bound": "", "estimate": " ~", "indicator": " ?", "none": ""}
_WIDTH = 240  # columns; lines are never folded


@dataclass(frozen=True, kw_only=True)
class Line:
    """One number of a table.

    Parameters
    ----------
    case, quantity : str
        What it is.
    value : Value
        The number, SI.
    unit : Unit
        What it is shown in.
    limit : float, optional
        The largest magnitude allowed, SI.
    where : str
        Place and face in words.
    """

    case: str
    quantity: str
    value: Value
    unit: Unit
    limit: float | None = None
    where: str = ""

    @property
    def judgement(self) -> Judgement | None:
        """The number against its limit, where there is one."""
        if self.limit is None:
            return None
        return Judgement(quantity=self.quantity, value=self.value, limit=self.limit)


@dataclass(frozen=True, kw_only=True)
class AskedRow:
    """One number that was asked for.

    Parameters
    ----------
    name, quantity : str
        What was asked, and what of it.
    value : Value
        The number, SI, with its case.
    unit : Unit
        What it is shown in.
    where : str
        Place in words.
    """

    name: str
    quantity: str
    value: Value
    unit: Unit
    where: str


def asked_table(rows: Sequence[AskedRow], what: str = "case") -> str:
    """Table of what was asked for, with signs; empty where nothing was."""
    if not rows:
        return ""
    shown = [
        (
            row.name,
            row.quantity,
            _signed(row.value, row.unit),
            band(row.value),
            row.value.case,
            row.where,
        )
        for row in rows
    ]
    return columns(("asked", "quantity", "value", "band", what, "where"), shown)


def extremes_table(
    rows: Sequence[tuple[str, Value, Value, str]], units: DisplayUnits
) -> str:
    """Table of what each support brings over all combinations.

    Rows hold the support, the force that pushes the plate up the most and the least,
    and its line reactions in words.
    """
    shown = [
        (
            name,
            _signed(most, units.force),
            most.case,
            _signed(least, units.force),
            least.case,
            line,
        )
        for name, most, least, line in rows
    ]
    header = ("support", "pushes up at most", "in", "at least", "in", "line reactions")
    return columns(header, shown)


def _signed(value: Value, unit: Unit) -> str:
    """A number with its sign and unit."""
    if math.isnan(value.value):
        return "-"
    return f"{value.value / unit.size:+.4g} {unit.symbol}"


def values_table(lines: Sequence[Line], what: str = "case") -> str:
    """Table of values, bands, limits and where.

    Magnitudes are shown; a sign that matters is in the quantity or in the place. `what`
    is what the numbers are of, a case or a combination.
    """
    rows = []
    for line in lines:
        judgement = line.judgement
        known = not math.isnan(line.value.value)
        limit, used = "-", "-"
        if judgement is not None:
            limit = line.unit.show(judgement.limit)
            used = f"{judgement.used:.2f}" if known else "?"
        shown = line.unit.show(abs(line.value.value)) if known else "-"
        rows.append(
            (line.case, line.quantity, shown, band(line.value), limit, used, line.where)
        )
    header = (what, "quantity", "value", "band", "limit", "used", "where")
    return columns(header, rows)


def reactions_table(
    rows: Sequence[tuple[str, str, Value, float, float]],
    units: DisplayUnits,
) -> str:
    """Table of what each support brings: force, and largest push and pull along it.

    Rows hold case, support, force, and the largest pull (0 or less) and push (0 or
    more) in N/m; nan at a point.
    """
    shown = []
    for case, name, value, least, most in rows:
        force = f"{value.value / units.force.size:+.4g} {units.force.symbol}"
        line = "-"
        if not math.isnan(least):
            size, symbol = units.line_force.size, units.line_force.symbol
            # What is a hundredth of the other is the mesh's own unevenness.
            largest = max(most, -least)
            ends = [end for end in (least, most) if abs(end) > 0.01 * largest]
            line = " and ".join(f"{end / size:+.3g}" for end in ends) or "0"
            line = f"{line} {symbol}"
        shown.append((case, name, force, band(value), line))
    header = ("case", "support", "pushes up", "band", "largest line reaction")
    return columns(header, shown)


def band(value: Value) -> str:
    """Write half the width of a band, with the mark of its kind."""
    if value.lower is None or value.upper is None:
        return "not estimated"
    half = max(value.upper - value.value, value.value - value.lower)
    if value.value == 0.0:
        return f"+-{half:.2g}{MARKS[value.kind]}"
    share = 100.0 * half / abs(value.value)
    shown = "< 0.01" if share < 0.01 else f"{share:.2g}"
    return f"{shown} %{MARKS[value.kind]}"


def legend(lines: Sequence[Line]) -> str:
    """Explain the marks, where some number has a band."""
    if all(line.value.kind == "none" for line in lines):
        return ""
    return "no mark: bound   ~ estimate   ? indicator"


def columns(header: Sequence[str], rows: Sequence[Sequence[str]]) -> str:
    """Lay out columns without rules."""
    from rich.console import Console
    from rich.table import Table

    table = Table(box=None, pad_edge=False, padding=(0, 2, 0, 0), header_style="")
    for name in header:
        table.add_column(name, no_wrap=True)
    for row in rows:
        table.add_row(*[_plain(cell) for cell in row])
    out = StringIO()
    Console(file=out, width=_WIDTH, color_system=None, highlight=False).print(table)
    return "\n".join(text.rstrip() for text in out.getvalue().splitlines())


def _plain(cell: str) -> str:
    """Keep brackets of the user's names from being read as markup."""
    return cell.replace("[", r"\[")
