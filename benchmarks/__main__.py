"""Handbook cases beside what kplate finds; convergence, bands, timings.

``python -m benchmarks`` solves all cases, or those named; the commands below do more.
"""

import argparse
import json
import os
import sys
from collections.abc import Iterator, Sequence
from concurrent.futures import ProcessPoolExecutor
from dataclasses import asdict
from functools import partial
from pathlib import Path

from benchmarks import (
    bands,
    convergence,
    elements,
    numbers,
    page,
    plots,
    records,
    report,
    timing,
    window,
)
from kplate.elements import ELEMENTS
from kplate.errors import KplateError
from kplate.files import replacing
from kplate.heading import version

COMMANDS = {
    "convergence": "error of one number against unknowns, element by element",
    "bands": "bands of numbers beside values computed otherwise",
    "page": "all of it as one HTML file: every case, convergence, times",
    "elements": "unknowns and seconds to an error, element by element",
    "timing": "times of each stage, memory and growth, as ratios of one run",
    "window": "time and memory of the 3-D window to 500,000 triangles",
}
# Numbers whose convergence the page shows: a clamped edge moment, a corner force, and
# deflections of plates with obtuse and re-entrant corners.
STUDIES = (("cccc_u_1", 4), ("ssss_u_1", 6), ("rhomb_c_u_30", 1), ("lshape_S_u", 1))
TIMES = (
    "CPU seconds of one thread on a machine that others used at the same time; dkt on "
    "a square. Quote ratios only."
)


def main(arguments: Sequence[str] | None = None) -> int:
    """Run what the command line asks for.

    Returns
    -------
    int
        0; 1 where a case was not solved or a bound is false; 2 for bad input.
    """
    words = list(sys.argv[1:] if arguments is None else arguments)
    try:
        if words and words[0] in COMMANDS:
            return _command(words[0], words[1:])
        return _handbook(words)
    except KplateError as error:
        print(error, file=sys.stderr)
        return 2


def _handbook(words: Sequence[str]) -> int:
    commands = "".join(f"\n  {name:12s}{text}" for name, text in COMMANDS.items())
    parser = argparse.ArgumentParser(
        prog="python -m benchmarks",
        description=__doc__,
        epilog=f"commands, each with --help:{commands}",
        formatter_class=argparse.RawDescriptionHelpFormatter,
    )
    parser.add_argument("case", nargs="*", help="names of cases; all if left out")
    parser.add_argument("--family", help="cases of this family only")
    parser.add_argument("--list", action="store_true", help="list the cases and stop")
    parser.add_argument("--element", default="auto", choices=["auto", *ELEMENTS])
    parser.add_argument(
        "--tolerance",
        type=_share,
        help="half width of bands; 0.1 %% if left out",
    )
    parser.add_argument(
        "--triangles", type=int, help="one mesh of about so many instead of bands"
    )
    parser.add_argument("--json", type=Path, metavar="FILE", help="write all numbers")
    parser.add_argument("--html", type=Path, metavar="FILE", help="write a page")
    parser.add_argument("--jobs", type=int, default=min(2, os.cpu_count() or 1))
    args = parser.parse_args(words)
    problems = records.chosen(args.case, args.family)
    if args.list:
        for own in problems:
            print(f"{own['id']:24s} {own['family']:28s} {own['title']}")
        return 0
    run = []
    for one in _measured(problems, args):
        run.append(one)
        print("\n".join(report.lines(one)), flush=True)
    print("\n".join(report.summary(run)))
    if args.json:
        _write(args.json, json.dumps(report.as_json(run), indent=1))
    if args.html:
        _write(args.html, page.page(run, version=version()))
    return int(not all(one.numbers for one in run))


def _page(parser: argparse.ArgumentParser, words: Sequence[str]) -> int:
    parser.add_argument(
        "--out", type=Path, default=Path(__file__).with_name("page.html")
    )
    parser.add_argument(
        "--timing",
        type=Path,
        metavar="FILE",
        help="times written by `timing --json`, instead of taking those to 100,000",
    )
    parser.add_argument("--jobs", type=int, default=min(2, os.cpu_count() or 1))
    args = parser.parse_args(words)
    args.tolerance, args.element, args.triangles = None, "auto", None
    run = []
    for one in _measured(records.records(), args):
        run.append(one)
        print(f"{len(run)}/{len(records.records())} {one.problem['id']}", flush=True)
    studies = []
    for name, number in STUDIES:
        print(f"convergence of {name}", flush=True)
        studies.append(convergence.study(records.record(name), number))
    if args.timing:
        stated = json.loads(args.timing.read_text("utf-8"))
        timings = [timing.Timing(**one) for one in stated]
    else:
        timings = timing.main(timing.QUICK)
    text = page.page(run, studies, timings, version=version(), words=TIMES)
    _write(args.out, text)
    print(f"written: {args.out} ({len(text) / 1000:.0f} kB)")
    return 0


def _measured(
    problems: Sequence[dict], args: argparse.Namespace
) -> Iterator[numbers.Measured]:
    """Measure cases, some at a time, in their order."""
    how = partial(
        numbers.measure,
        tolerance=args.tolerance,
        element=args.element,
        triangles=args.triangles,
    )
    if args.jobs < 2 or len(problems) < 2:
        yield from map(how, problems)
        return
    with ProcessPoolExecutor(args.jobs) as pool:
        yield from pool.map(how, problems)


def _command(name: str, words: Sequence[str]) -> int:
    parser = argparse.ArgumentParser(
        prog=f"python -m benchmarks {name}", description=COMMANDS[name]
    )
    if name == "bands":
        parser.add_argument("case", nargs="*", help="names of cases; all if left out")
        parser.add_argument("--tolerance", type=_share, default=0.01)
        args = parser.parse_args(words)
        names = [records.record(case)["id"] for case in args.case] or None
        return int(bands.main(args.tolerance, names) > 0)
    if name == "convergence":
        return _convergence(parser, words)
    if name == "page":
        return _page(parser, words)
    if name == "timing":
        return _timing(parser, words)
    if name == "window":
        parser.add_argument("file", nargs="?", type=Path, help="measure this one, JSON")
        window.main(parser.parse_args(words).file)
        return 0
    parser.parse_args(words)
    elements.main()
    return 0


def _timing(parser: argparse.ArgumentParser, words: Sequence[str]) -> int:
    parser.add_argument(
        "--quick", action="store_true", help="to 100,000 unknowns, under a minute"
    )
    parser.add_argument("--element", default="dkt", choices=list(ELEMENTS))
    parser.add_argument("--json", type=Path, metavar="FILE", help="write the numbers")
    parser.add_argument("--svg", type=Path, metavar="FILE", help="write the plot")
    args = parser.parse_args(words)
    found = timing.main(timing.QUICK if args.quick else timing.SIZES, args.element)
    if not args.quick:
        print("\n".join(timing.commands()))
    if args.json:
        _write(args.json, json.dumps([asdict(one) for one in found], indent=1))
    if args.svg:
        _write(args.svg, plots.timing_plot(found))
    return 0


def _convergence(parser: argparse.ArgumentParser, words: Sequence[str]) -> int:
    parser.add_argument("case", help="name of the case")
    parser.add_argument(
        "--number", type=int, help="which of its numbers; without it they are listed"
    )
    parser.add_argument("--most", type=int, default=convergence.MOST, help="unknowns")
    parser.add_argument("--svg", type=Path, metavar="FILE", help="write the plot")
    args = parser.parse_args(words)
    problem = records.record(args.case)
    if args.number is None:
        for number, item in enumerate(problem["quantities"], start=1):
            print(f"{number:3d}  {item['coefficient']} at {item['place']}")
        return 0
    own = convergence.study(problem, args.number, args.most)
    print("\n".join(convergence.lines(own)))
    if args.svg:
        _write(args.svg, plots.convergence_plot(own))
    return 0


def _write(path: Path, text: str) -> None:
    with replacing(path) as temporary:
        temporary.write_text(text, "utf-8")


def _share(text: str) -> float:
    """A tolerance: 0.001, or 0.1%."""
    try:
        number = float(text.rstrip("% ")) * (0.01 if text.endswith("%") else 1.0)
    except ValueError:
        number = 0.0
    if not 0.0 < number < 1.0:
        raise argparse.ArgumentTypeError(
            f"{text!r} is no tolerance; give a share such as 0.001, or 0.1%"
        )
    return number


if __name__ == "__main__":
    sys.exit(main())
