"""The command line: arguments, progress, exit codes, and the only printing of the program.

Data goes to standard output, everything else to standard error. Only argparse is imported before a
command is known, so that ``--help`` is quick.
"""

from __future__ import annotations

import argparse
import io
import os
import sys
from collections.abc import Callable, Sequence
from pathlib import Path

from auditor import __version__

_EXIT_CODES = """\
exit codes:
  0  published, firm
  1  the program itself failed
  2  wrong usage or plant file; nothing was published
  3  no usable data; earlier reports are untouched
  4  published, but a person must look: impossible intervals, or a balance that does not close
  5  input/output failure, or another run holds the lock
  6  published, provisional: coverage, missing or late exports
"""


def _parser() -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(
        prog="auditor",
        description="Turn a month of plant-logger CSV exports into a statement that a person can sign.",
        epilog=_EXIT_CODES,
        formatter_class=argparse.RawDescriptionHelpFormatter,
    )
    parser.add_argument("--version", action="version", version=f"auditor {__version__}")
    commands = parser.add_subparsers(dest="command", required=True, metavar="COMMAND")
    _add_audit(commands)
    _add_check(commands)
    _add_draft(commands)
    _add_demo(commands)
    _add_nightly(commands)
    return parser


def _command(
    commands: argparse._SubParsersAction[argparse.ArgumentParser], name: str, text: str
) -> argparse.ArgumentParser:
    command = commands.add_parser(
        name,
        help=text,
        description=text,
        epilog=_EXIT_CODES,
        formatter_class=argparse.RawDescriptionHelpFormatter,
    )
    command.add_argument("--quiet", action="store_true", help="say nothing but errors on standard error")
    command.add_argument("--json", action="store_true", help="print the result as JSON on standard output")
    return command


def _add_audit(commands: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    command = _command(commands, "audit", "Audit one site over one period and write its report.")
    command.add_argument("site", type=Path, metavar="SITE", help="folder with plant.toml and logs/")
    command.add_argument("--month", metavar="YYYY-MM", help="calendar month in the site's time zone")
    command.add_argument(
        "--from", dest="start", metavar="DATE", help="first local date (inclusive), YYYY-MM-DD"
    )
    command.add_argument("--to", dest="end", metavar="DATE", help="last local date (inclusive), YYYY-MM-DD")
    command.add_argument(
        "--out", type=Path, metavar="DIR", help="write the outputs here instead; the history is left alone"
    )
    command.set_defaults(run="auditor.commands:run_audit")


def _add_check(commands: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    command = _command(
        commands,
        "check",
        "Read plant file and exports, compute nothing: what was recognised, and what nobody claims.",
    )
    command.add_argument(
        "site", type=Path, metavar="SITE", nargs="?", help="folder with plant.toml and logs/"
    )
    command.add_argument("--schema", action="store_true", help="print the JSON schema of plant.toml instead")
    command.set_defaults(run="auditor.commands:run_check")


def _add_draft(commands: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    command = _command(
        commands,
        "draft",
        "Propose a first plant.toml from a folder of exports, with blanks for what they cannot prove.",
    )
    command.add_argument("logs", type=Path, metavar="LOGS", help="folder of exports; only ever read")
    command.add_argument(
        "--out", type=Path, metavar="FILE", help="new file to write instead of printing; never written over"
    )
    command.set_defaults(run="auditor.commands:run_draft")


def _add_demo(commands: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    command = _command(commands, "demo", "Lay out a demo site: its plant file and a month of exports.")
    command.add_argument("name", metavar="NAME", help="emberlund or quillmere")
    command.add_argument("folder", type=Path, metavar="DIR", help="new or empty folder for the site")
    command.add_argument(
        "--audit", action="store_true", help="audit it too; exit 0 once the report is published"
    )
    command.set_defaults(run="auditor.commands:run_demo")


def _add_nightly(commands: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    command = _command(commands, "nightly", "Audit every month whose inputs changed, of one or many sites.")
    command.add_argument(
        "sites", type=Path, metavar="SITE", nargs="+", help="folders with plant.toml and logs/"
    )
    command.set_defaults(run="auditor.commands:run_nightly")


def main(arguments: Sequence[str] | None = None) -> int:
    """Run one command and return its exit code."""
    for stream in (sys.stdout, sys.stderr):
        # A pipe or an old locale may know only ASCII; our texts hold plus-minus signs and no-break spaces.
        if isinstance(stream, io.TextIOWrapper):
            stream.reconfigure(encoding="utf-8", errors="backslashreplace")
    options = _parser().parse_args(arguments)
    module_name, _, function_name = options.run.partition(":")
    import importlib

    run: Callable[[argparse.Namespace], int] = getattr(importlib.import_module(module_name), function_name)
    from auditor.records.errors import AuditorError, Exit

    try:
        code = int(run(options))
        sys.stdout.flush()
        return code
    except AuditorError as error:
        sys.stderr.write(f"{error}\n")
        return int(error.exit_code)
    except BrokenPipeError:
        # Whoever read our standard output has gone; nothing is left to be told, not even at the end.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return int(Exit.INPUT_OUTPUT)
    except KeyboardInterrupt:
        sys.stderr.write("interrupted; earlier reports are whole\n")
        return int(Exit.INPUT_OUTPUT)


if __name__ == "__main__":
    sys.exit(main())
