"""The benchmark page: one HTML file with its plots in it, nothing fetched from outside.

``python -m benchmarks page`` solves all cases, studies convergence, takes times, and
writes it.
"""

from collections.abc import Iterator, Sequence
from html import escape
from typing import Any

from benchmarks import cases, drawings, plots, records, report
from benchmarks.convergence import Study
from benchmarks.numbers import Measured, Number
from benchmarks.timing import Timing
from benchmarks.timing import summary as timing_summary

STYLE = """
body{font:15px/1.45 system-ui,sans-serif;max-width:72rem;margin:2rem auto;
padding:0 1rem;color:#1a1a1a;background:#fff}
h1{font-size:1.7rem}h2{font-size:1.25rem;margin-top:2.2rem}
table{border-collapse:collapse;font-size:.85rem}
td,th{padding:.15rem .55rem;text-align:right;border-bottom:1px solid #ddd;
font-variant-numeric:tabular-nums}
th{font-weight:600;background:#f4f4f4}
td:first-child,th:first-child,table.t td,table.n td:last-child,table.n td:nth-child(2)
{text-align:left}tr.c td{background:#f9f9f9;text-align:left;padding-top:.5rem}
.i{color:#00613f}.n{color:#7a5c00}.b{color:#a11}.s{color:#666}
details{margin:.4rem 0}summary{cursor:pointer;font-weight:600}
svg{max-width:100%;height:auto}tr.c svg{vertical-align:middle;margin-right:.6rem}
.w{overflow-x:auto}.q{border-left:4px solid #c80;background:#fff7e6;padding:.5rem .8rem}
"""
CLASSES = {"inside": "i", "0.1 %": "n", "beyond": "b", "": "s"}


def page(
    run: Sequence[Measured],
    studies: Sequence[Study] = (),
    timings: Sequence[Timing] = (),
    *,
    version: str = "",
    words: str = "",
) -> str:
    """The whole file as text.

    Parameters
    ----------
    run : sequence of Measured
        The cases as they were solved.
    studies : sequence of Study
        Convergence of some numbers.
    timings : sequence of Timing
        Times, or none.
    version : str
        Of kplate.
    words : str
        When the times were taken, and on what.
    """
    return "\n".join(_parts(run, studies, timings, version, words)) + "\n"


def sentence(run: Sequence[Measured]) -> str:
    """What the run comes to, for README."""
    own = report.tallies(run)[-1]
    banded = [n for n in report.numbers_of(run) if n.kind == "bound"]
    false = [n for n in banded if _false(n)]
    wrong = report.misprints(run)
    recalled = sum(one.figure.from_memory for one in wrong)
    return (
        f"Of {own.numbers:,} numbers computed without finite elements in "
        f"{len(run)} cases, kplate meets {own.near:,} within 0.1 % (median deviation "
        f"{100.0 * own.median:.5f} %); {len(banded)} carry a proven bound, "
        f"{'none' if not false else len(false)} of them false. Of {own.figures} "
        f"that stand in a handbook or paper, {own.inside} round to the last printed "
        f"digit; {len(wrong)} figures, {recalled} of them recalled from memory, do not "
        "agree with their value; each is listed with its evidence."
    )


def _false(number: Number) -> bool:
    """Whether a bound leaves out the value computed otherwise."""
    if number.value is None or number.lower is None or number.upper is None:
        return False
    room = number.rounding
    return not number.lower - room <= number.value <= number.upper + room


def _parts(
    run: Sequence[Measured],
    studies: Sequence[Study],
    timings: Sequence[Timing],
    version: str,
    words: str,
) -> Iterator[str]:
    yield "<!doctype html><html lang=en><meta charset=utf-8>"
    yield "<meta name=viewport content='width=device-width'>"
    yield f"<title>kplate {escape(version)}: benchmarks</title><style>"
    yield f"{STYLE}{drawings.STYLE}</style>"
    yield f"<h1>kplate {escape(version)} beside handbooks and exact values</h1>"
    yield f"<p id=sentence>{escape(sentence(run))}</p>"
    yield (
        "<p class=q>Results are for a qualified engineer's judgement. Local codes and "
        "licensed practice decide.</p>"
    )
    yield f"<p>{escape(report.LEGEND)}</p>"
    yield "<h2>By family</h2><div class=w><table>"
    yield from _tallies(run)
    yield "</table></div>"
    yield plots.deviation_plot(report.numbers_of(run))
    yield from _misprints(run)
    if studies:
        yield (
            "<h2>Convergence</h2><p>Even meshes, finer and finer, and meshes refined "
            "where the bands ask for it; dotted: half the width of the band.</p>"
        )
        yield from (plots.convergence_plot(one) for one in studies)
    if timings:
        yield from _timings(timings, words)
    yield "<h2>Every number</h2>"
    for family in dict.fromkeys(one.problem["family"] for one in run):
        own = [one for one in run if one.problem["family"] == family]
        count = sum(len(one.numbers) for one in own)
        yield f"<details><summary>{escape(family)}: {len(own)} cases, {count} numbers"
        yield "</summary><div class=w><table class=n>"
        for one in own:
            yield from _case(one)
        yield "</table></div></details>"
    yield from _sources()


def _tallies(run: Sequence[Measured]) -> Iterator[str]:
    yield _row(
        "family", "in print", "inside", "0.1 %", "beyond", "values", "within 0.1 %",
        "beyond", "median", "largest", tag="th",
    )  # fmt: skip
    for own in report.tallies(run):
        yield _row(
            own.family, own.figures, own.inside, own.printed_near, own.printed_beyond,
            own.numbers, own.near, own.beyond, f"{100.0 * own.median:.5f} %",
            f"{100.0 * own.largest:.3f} %",
        )  # fmt: skip


def _misprints(run: Sequence[Measured]) -> Iterator[str]:
    found = report.misprints(run)
    yield (
        f"<h2>Figures in print that do not agree with their value</h2><p>{len(found)} "
        "figures: misprints, series cut short, or wrongly recalled; "
        f"{sum(one.cut for one in found)} are cut off where they should be rounded. "
        f"{sum(one.excluded for one in found)} are left out by a bound that kplate "
        "proves as well.</p><details><summary>The list</summary><div class=w>"
        "<table class=t>"
    )
    yield _row("case", "coefficient", "evidence", tag="th")
    for one in found:
        own = one.number
        where = f"{own.coefficient} at {own.place}"
        yield _row(own.case, where, one.words)
    yield "</table></div></details>"


def _timings(timings: Sequence[Timing], words: str) -> Iterator[str]:
    yield f"<h2>Times</h2><p>{escape(words)}</p>"
    yield plots.timing_plot(timings)
    yield "<div class=w><table>"
    stages = timings[0].stages
    yield _row("unknowns", *stages, "bare", "solve", "ratio", "GB", tag="th")
    for own in timings:
        seconds = (f"{own.stages[stage]:.3g}" for stage in stages)
        memory = f"{own.memory:.2f} / {own.memory_all:.2f}"
        ends = (f"{own.bare:.3g}", f"{own.solve:.3g}", f"{own.ratio:.2f}", memory)
        yield _row(f"{own.unknowns:,}", *seconds, *ends)
    yield f"</table></div><p>{escape(' '.join(timing_summary(timings)))}</p>"


def _case(one: Measured) -> Iterator[str]:
    own = one.problem
    try:
        drawn = drawings.thumbnail(cases.plate(own))
    except Exception:  # a plate that cannot be built is shown without its picture
        drawn = ""
    how = f"{one.element}, {one.unknowns:,} unknowns" if one.numbers else one.failure
    note = f" {own['note']}." if own.get("note") else ""
    yield (
        f"<tr class=c><td colspan=8>{drawn}<b>{escape(own['id'])}</b> "
        f"{escape(own['title'])}, nu {own['nu']:g}.{escape(note)} "
        f"<span class=s>{escape(how)}</span>"
    )
    yield _row(
        "coefficient", "at", "published", "computed", "half band", "deviation",
        "value (digits)", "print; value by", tag="th",
    )  # fmt: skip
    for number in one.numbers:
        yield _number(number)


def _number(own: Number) -> str:
    figure = own.figures[0] if own.figures else None
    half = own.half_band
    mark = report.MARKS.get(own.kind, "")
    found = own.print_class()
    printed = "none known" if figure is None else f"{figure.published:.6g}"
    value = "none known" if own.value is None else f"{own.value:.8g} ({own.digits})"
    source = "" if figure is None else f"{found}, {figure.words}; "
    return _row(
        own.coefficient, own.place, printed, f"{own.computed:.7g}",
        "-" if half is None else report.percent(half) + mark,
        f"{100.0 * own.deviation:+.4f} %", value, source + own.method,
        shade=CLASSES[found],
    )  # fmt: skip


def _sources() -> Iterator[str]:
    known = records.reference()
    yield "<h2>Sources</h2><table class=t>"
    for name, words in (known["publications"] | known["sources"]).items():
        yield _row(name, words)
    yield "</table><p>Of the reference set, kplate cannot state yet: "
    left: dict[str, str] = known["left_out"]
    groups = [
        f"{why} ({', '.join(name for name, own in left.items() if own == why)})"
        for why in dict.fromkeys(left.values())
    ]
    yield escape("; ".join(groups)) + ".</p></html>"


def _row(*cells: Any, tag: str = "td", shade: str = "") -> str:
    """A row; a shade colours its last cell."""
    out = [f"<{tag}>{escape(str(cell), quote=False)}" for cell in cells]
    if shade:
        out[-1] = out[-1].replace(f"<{tag}>", f"<{tag} class={shade}>", 1)
    return "<tr>" + "".join(out)
