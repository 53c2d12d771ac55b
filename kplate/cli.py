"""The command line: parse, call one public function, print.

Libraries are imported by the command that needs them, so that a key pressed while they
load is heard. Results go to stdout, everything else to stderr. Exit status 0: passes;
1: fails or not proven; 2: bad input or no solution.
"""

import argparse
import re
import signal
import sys
import textwrap
import warnings
from collections.abc import Sequence
from importlib import metadata
from io import TextIOWrapper
from pathlib import Path

from kplate.errors import InputError, KplateError, KplateWarning

INTERRUPTED = 130  # 128 + SIGINT, as shells have it
WIDTH = 100  # columns that a screen and an e-mail hold
PLACE = re.compile(r"\([^ ()]+, [^ ()]+\)(?: mm| m| in| ft)?(?:, [a-z]+)?")
KEPT = "\N{NO-BREAK SPACE}"  # stands in no name


def main(argv: Sequence[str] | None = None) -> int:
    """Run one command and return its exit status."""
    _print_anything()
    try:
        args = _parser().parse_args(argv)
        warnings.showwarning = _show_warning  # type: ignore[assignment]  # takes fewer
        return int(args.run(args))
    except KplateError as error:
        print(f"kplate: {args.file}: {_one_line(error)}", file=sys.stderr)
        return 2
    except KeyboardInterrupt:
        print("kplate: interrupted; nothing more is written.", file=sys.stderr)
        return INTERRUPTED


def _print_anything() -> None:
    """Let names be printed that the terminal's encoding does not hold."""
    for stream in (sys.stdout, sys.stderr):
        if isinstance(stream, TextIOWrapper):
            stream.reconfigure(errors="replace")


def _say(text: str) -> None:
    """Print results; say it once where nobody takes them."""
    try:
        print(text)
        if sys.stdout is not None:
            sys.stdout.flush()
    except OSError as error:
        # Keep the interpreter from trying again, in vain, when it closes.
        sys.stdout = None
        raise InputError(
            f"the results cannot be printed ({error.strerror})."
        ) from error


def _folded(text: str) -> str:
    """Fold lines that are too long at spaces, but not inside a place."""
    fold = textwrap.TextWrapper(
        width=WIDTH,
        subsequent_indent="    ",
        break_long_words=False,
        break_on_hyphens=False,
    )
    lines = []
    for line in text.splitlines():
        if len(line) > WIDTH:
            kept = PLACE.sub(lambda place: place[0].replace(" ", KEPT), line)
            lines += fold.fill(kept).replace(KEPT, " ").splitlines()
        else:
            lines.append(line)
    return "\n".join(lines)


def _parser() -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(
        prog="kplate",
        description="Thin flat panels from their outline to a judged answer.",
        epilog="Exit status: 0 passes, 1 fails or not proven, 2 bad input.",
    )
    parser.add_argument(
        "--version", action="version", version=f"kplate {metadata.version('kplate')}"
    )
    commands = parser.add_subparsers(title="commands", required=True, metavar="COMMAND")
    command = commands.add_parser("check", help="solve a panel file, judge it, write")
    command.add_argument("file", type=Path, help="panel file (TOML)")
    command.add_argument(
        "--out",
        type=Path,
        help="directory for the results; results/NAME if left out",
    )
    command.set_defaults(run=_check)
    command = commands.add_parser("size", help="the thinnest of the stock that passes")
    command.add_argument("file", type=Path, help="panel file (TOML)")
    command.set_defaults(run=_size)
    command = commands.add_parser("new", help="write a starter panel file")
    command.add_argument("file", type=Path, help="panel file to write")
    command.set_defaults(run=_new)
    command = commands.add_parser("compare", help="what changed between two results")
    command.add_argument("file", type=Path, metavar="OLD", help="record (.json)")
    command.add_argument("new", type=Path, metavar="NEW", help="record (.json)")
    command.set_defaults(run=_compare)
    command = commands.add_parser("view", help="show a result in a 3-D window")
    command.add_argument("file", type=Path, help="fields (.vtu) written by check")
    command.add_argument(
        "--picture",
        type=Path,
        metavar="FILE",
        help="write a picture (.png, .svg, .pdf) instead; needs no display",
    )
    command.add_argument("--quantity", help='of the picture, such as "von Mises"')
    command.add_argument("--case", help="of the picture; the first if left out")
    command.set_defaults(run=_view)
    return parser


def _check(args: argparse.Namespace) -> int:
    from kplate.check import check

    out = args.out if args.out is not None else Path("results") / args.file.stem
    checked = check(args.file, out=out, progress=_show_step)
    written = ", ".join(str(path) for path in checked.files)
    _say(_folded(f"{checked.text}\nwritten: {written}"))
    return checked.status


def _size(args: argparse.Namespace) -> int:
    from kplate.choosing import choose_thickness

    sized = choose_thickness(args.file, progress=_show_step)
    _say(sized.text)
    return sized.status


def _show_step(stage: str, done: float) -> None:
    """Show a person who waits how far it is; files and pipes get results only."""
    if sys.stderr is not None and sys.stderr.isatty():
        print(f"{100.0 * done:3.0f} %  {stage}", file=sys.stderr)


def _new(args: argparse.Namespace) -> int:
    from kplate.check import new_panel

    _say(f"written: {new_panel(args.file)}; now run: kplate check {args.file}")
    return 0


def _compare(args: argparse.Namespace) -> int:
    from kplate.comparing import compare

    comparison = compare(args.file, args.new)
    _say(comparison.text)
    return comparison.status


def _view(args: argparse.Namespace) -> int:
    from kplate.output.view import view, write_view

    if args.picture is not None:
        quantity = args.quantity or "deflection"
        path = write_view(args.file, args.picture, quantity=quantity, case=args.case)
        _say(f"written: {path}")
        return 0
    if args.quantity is not None or args.case is not None:
        raise InputError(
            "--quantity and --case are of a picture; add --picture FILE, or choose "
            "them in the window."
        )
    # The window's loop does not look at Python's own handler.
    signal.signal(signal.SIGINT, signal.SIG_DFL)
    view(args.file)
    return 0


def _one_line(error: Exception) -> str:
    return " ".join(str(error).split())


def _show_warning(message: Warning | str, category: type[Warning], *_: object) -> None:
    if issubclass(category, KplateWarning):
        print(f"kplate: warning: {message}", file=sys.stderr)
