"""The command line: parse, call one public function, print.

Results go to stdout, everything else to stderr. Exit status 0: passes; 1: fails or not
proven; 2: bad input or no solution.
"""

import argparse
import os
import sys
import warnings
from collections.abc import Sequence
from pathlib import Path

from kplate.check import check, new_panel, version
from kplate.errors import KplateError, KplateWarning
from kplate.output.view import view

INTERRUPTED = 130  # 128 + SIGINT, as shells have it


def main(argv: Sequence[str] | None = None) -> int:
    """Run one command and return its exit status."""
    args = _parser().parse_args(argv)
    warnings.showwarning = _show_warning  # type: ignore[assignment]  # fewer arguments
    try:
        status = int(args.run(args))
        sys.stdout.flush()
    except KplateError as error:
        print(f"kplate: {args.file}: {_one_line(error)}", file=sys.stderr)
        return 2
    except BrokenPipeError:
        # The reader went away; keep the interpreter from complaining when it closes.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return 2
    except KeyboardInterrupt:
        print("kplate: interrupted; nothing more is written.", file=sys.stderr)
        return INTERRUPTED
    return status


def _parser() -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(
        prog="kplate",
        description="Thin flat panels from their outline to a judged answer.",
        epilog="Exit status: 0 passes, 1 fails or not proven, 2 bad input.",
    )
    parser.add_argument("--version", action="version", version=f"kplate {version()}")
    commands = parser.add_subparsers(title="commands", required=True, metavar="COMMAND")
    command = commands.add_parser("check", help="solve a panel file, judge it, write")
    command.add_argument("file", type=Path, help="panel file (TOML)")
    command.add_argument(
        "--out",
        type=Path,
        help="directory for the results; results/NAME if left out",
    )
    command.set_defaults(run=_check)
    command = commands.add_parser("new", help="write a starter panel file")
    command.add_argument("file", type=Path, help="panel file to write")
    command.set_defaults(run=_new)
    command = commands.add_parser("view", help="show a result in a 3-D window")
    command.add_argument("file", type=Path, help="fields (.vtu) written by check")
    command.set_defaults(run=_view)
    return parser


def _check(args: argparse.Namespace) -> int:
    out = args.out if args.out is not None else Path("results") / args.file.stem
    checked = check(args.file, out=out)
    print(checked.text)
    print("written: " + ", ".join(str(path) for path in checked.files))
    return checked.status


def _new(args: argparse.Namespace) -> int:
    print(f"written: {new_panel(args.file)}; now run: kplate check {args.file}")
    return 0


def _view(args: argparse.Namespace) -> int:
    view(args.file)
    return 0


def _one_line(error: Exception) -> str:
    return " ".join(str(error).split())


def _show_warning(message: Warning | str, category: type[Warning], *_: object) -> None:
    if issubclass(category, KplateWarning):
        print(f"kplate: warning: {message}", file=sys.stderr)
