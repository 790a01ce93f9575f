"""The command ``aleafield``: arguments in, results on standard output, messages on standard error.

Exit status: 0 done; 1 the run ended but a stated requirement is not met; 2 the study or the arguments are at
fault; 3 interrupted, resumable.
"""

from __future__ import annotations

import argparse
import json
import os
import sys
from collections.abc import Callable, Mapping, Sequence
from io import TextIOWrapper
from pathlib import Path
from typing import TYPE_CHECKING, Any

from aleafield.errors import AleafieldError, InputError
from aleafield.report.caution import CAUTION

if TYPE_CHECKING:
    from aleafield.runs.progress import Progress
    from aleafield.runs.run import RunResult

DONE, UNMET, AT_FAULT, INTERRUPTED = 0, 1, 2, 3


def main(arguments: Sequence[str] | None = None) -> int:
    """Run one command and return its exit status; never raises for anything that a user can type."""
    try:
        status = _run_command(arguments)
    except AleafieldError as error:
        print(f"aleafield: {error}", file=sys.stderr)
        return error.exit_status
    except KeyboardInterrupt:
        print("aleafield: interrupted", file=sys.stderr)
        return INTERRUPTED
    except OSError as error:
        if error.filename is None and sys.stdout is not None:
            # standard output cannot be written: Python must not try again at exit
            os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        if isinstance(error, BrokenPipeError):  # whoever read the output has gone
            return DONE
        place = f"{error.filename}: " if error.filename else ""
        print(f"aleafield: {place}{error.strerror or error}", file=sys.stderr)
        return AT_FAULT
    return status


def _run_command(arguments: Sequence[str] | None) -> int:
    """Status of one command; its output has left the buffer when this ends."""
    if isinstance(sys.stdout, TextIOWrapper):
        sys.stdout.reconfigure(errors="backslashreplace")  # a title may hold what a terminal cannot show
    try:
        parsed = _parser().parse_args(arguments)
    except SystemExit:
        print(end="", flush=True)
        raise
    command: Callable[[argparse.Namespace], int] = parsed.command
    status = command(parsed)
    print(end="", flush=True)
    return status


def _parser() -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(
        prog="aleafield",
        description="How uncertain is a number computed from a neural field, and where its error comes from.",
        epilog=CAUTION,
        allow_abbrev=False,
    )
    parser.add_argument("--version", action=_Version, nargs=0, help="print the version and stop")
    commands = parser.add_subparsers(metavar="COMMAND", required=True)

    check = _command(commands, "check", _check, "read and validate a study; simulate nothing")
    check.add_argument("study", type=Path, metavar="STUDY", help="study file (TOML)")

    run = _command(commands, "run", _run, "run a study into a folder; resumes what is unfinished there")
    run.add_argument("study", type=Path, metavar="STUDY", help="study file (TOML)")
    run.add_argument("--out", type=Path, required=True, metavar="DIR", help="folder for the results")
    _working(run)

    report = _command(commands, "report", _report, "write report and figures again from what is stored")
    report.add_argument("folder", type=Path, metavar="DIR", help="folder of a finished run")
    report.add_argument("--study", type=Path, metavar="STUDY", help="the study with another report section")

    extend = _command(commands, "extend", _extend, "add samples to a finished run, keeping the old ones")
    extend.add_argument("folder", type=Path, metavar="DIR", help="folder of a finished run")
    extend.add_argument("--samples", type=int, required=True, metavar="N", help="how many more, at least")
    _working(extend)

    compare = _command(commands, "compare", _compare, "paired difference of two runs with the same samples")
    compare.add_argument("folder_a", type=Path, metavar="DIR_A")
    compare.add_argument("folder_b", type=Path, metavar="DIR_B")

    _command(commands, "verify", _verify, "solve problems with known answers; print orders and errors")
    return parser


def _command(
    commands: Any, name: str, function: Callable[[argparse.Namespace], int], help_text: str
) -> argparse.ArgumentParser:
    parser: argparse.ArgumentParser = commands.add_parser(
        name, help=help_text, description=help_text, allow_abbrev=False
    )
    parser.add_argument("--json", action="store_true", help="print one JSON document on standard output")
    parser.set_defaults(command=function)
    return parser


def _working(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("--workers", type=int, metavar="N", help="worker processes (default: all cores)")
    parser.add_argument("--quiet", action="store_true", help="no progress and no table")


class _Version(argparse.Action):
    """Looks the version up only when it is asked for: that takes longer than everything else here."""

    def __call__(self, parser: argparse.ArgumentParser, *_: object) -> None:
        from importlib.metadata import version

        print(f"aleafield {version('aleafield')}")
        parser.exit()


def _print_json(document: Mapping[str, Any]) -> None:
    print(json.dumps(document, indent=2, allow_nan=False))


def _check(arguments: argparse.Namespace) -> int:
    from aleafield.study.minimal import MINIMAL_STUDY
    from aleafield.study.reading import read_study

    if not arguments.study.exists():
        error = InputError("", "there is no such file", "a minimal valid study is:", file=arguments.study)
        print(f"aleafield: {error}\n\n{MINIMAL_STUDY}", file=sys.stderr)
        return AT_FAULT
    from aleafield.runs.check import check

    result = check(read_study(arguments.study))
    if arguments.json:
        _print_json(result.as_json())
    else:
        print(result.as_text())
    return DONE


def _run(arguments: argparse.Namespace) -> int:
    from aleafield.runs.run import run
    from aleafield.study.reading import read_study

    study = read_study(arguments.study)
    return _say(arguments, run(study, arguments.out, arguments.workers, _progress(arguments)))


def _report(arguments: argparse.Namespace) -> int:
    from aleafield.runs.report import report
    from aleafield.study.reading import read_study

    study = None if arguments.study is None else read_study(arguments.study)
    return _say(arguments, report(arguments.folder, study))


def _extend(arguments: argparse.Namespace) -> int:
    from aleafield.runs.extend import extend

    return _say(
        arguments, extend(arguments.folder, arguments.samples, arguments.workers, _progress(arguments))
    )


def _compare(arguments: argparse.Namespace) -> int:
    from aleafield.runs.compare import compare

    comparison = compare(arguments.folder_a, arguments.folder_b)
    if arguments.json:
        _print_json(comparison.as_json())
    else:
        print(comparison.as_text())
    return DONE


def _verify(arguments: argparse.Namespace) -> int:
    from aleafield.verification.problems import PROBLEMS
    from aleafield.verification.solving import table, verify

    verdicts = []
    total = sum(len(problem.series) for problem in PROBLEMS)
    for verdict in verify(PROBLEMS):
        verdicts.append(verdict)
        if sys.stderr.isatty():
            print(f"\r\x1b[Kverified {len(verdicts)} of {total}", end="", file=sys.stderr, flush=True)
    if sys.stderr.isatty():
        print("\r\x1b[K", end="", file=sys.stderr, flush=True)
    passed = all(verdict.passed for verdict in verdicts)
    if arguments.json:
        _print_json({"schema": 1, "passed": passed, "series": [verdict.as_json() for verdict in verdicts]})
    else:
        print(table(verdicts))
    return DONE if passed else UNMET


def _progress(arguments: argparse.Namespace) -> Progress | None:
    from aleafield.runs.progress import ProgressLine

    return None if arguments.quiet else ProgressLine()


def _say(arguments: argparse.Namespace, result: RunResult) -> int:
    """Print what a run found, and on standard error what it owes."""
    if arguments.json:
        _print_json(result.summary)
    elif not getattr(arguments, "quiet", False):
        from aleafield.report.terminal import result_lines

        colour = sys.stdout.isatty() and not os.environ.get("NO_COLOR")
        print("\n".join(result_lines(result.summary, result.files, colour)))
        print(f"\n{CAUTION}")
    for demand in result.unmet:
        print(f"aleafield: not met: {demand}", file=sys.stderr)
    return result.exit_status
