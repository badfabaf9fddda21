"""What may be typed, and the exit code that comes back."""

from __future__ import annotations

import argparse
import sys
import traceback
from collections.abc import Sequence
from typing import NoReturn

from ..errors import CAUTION, VERSION, MachineError, SwmodelError
from .words import COMMANDS, LISTS, folded

PROGRAM = "swmodel"
DESCRIPTION = """\
A bench for rotating shallow-water experiments. A TOML file states a set-up
and what is expected of it; swmodel checks whether the set-up can answer the
question, runs it, measures, and says holds, fails or undecided."""
EXIT_CODES = """\
exit codes: 0 done; 1 an expectation fails; 2 the request is wrong or the
check refuses it; 3 the solution became unphysical; 4 the machine failed it;
130/143 stopped by a signal, checkpoint written"""


class _Parser(argparse.ArgumentParser):
    """Names the nearest right word where one is mistyped."""

    def error(self, message: str) -> NoReturn:
        hint = ""
        if "invalid choice" in message:
            from ..choices import did_you_mean

            word = message.split("invalid choice: ")[1].split(" ")[0].strip("'\"")
            known = (*COMMANDS, *LISTS)
            hint = did_you_mean(word, known)
        self.exit(2, f"{self.prog}: {message}\n" + (f"{hint}\n" if hint else "") + f"{self.format_usage()}")


def build_parser() -> argparse.ArgumentParser:
    """Return the parser of the whole command line."""
    parser = _Parser(
        prog=PROGRAM,
        description=DESCRIPTION,
        epilog=f"{EXIT_CODES}\n\n{folded(CAUTION)}",
        formatter_class=argparse.RawDescriptionHelpFormatter,
        allow_abbrev=False,
    )
    parser.add_argument("--version", action="version", version=f"{PROGRAM} {VERSION}")
    commands = parser.add_subparsers(dest="command", metavar="COMMAND", required=True, parser_class=_Parser)

    def command(name: str) -> argparse.ArgumentParser:
        # one text for the listing and for the command's own help
        return commands.add_parser(
            name, help=COMMANDS[name], description=COMMANDS[name], epilog=folded(CAUTION), allow_abbrev=False
        )

    check = command("check")
    _configuration(check)
    _json(check)

    run = command("run")
    _configuration(run)
    run.add_argument("--into", metavar="DIR", help="folder of the run, new or empty (default: runs/NAME)")
    _strict(run)

    resume = command("resume")
    resume.add_argument("run", metavar="RUN", help="folder of a run")
    resume.add_argument("--until", metavar="T", help='a new end, counted from time 0, such as "5 day"')
    _strict(resume)

    judge = command("judge")
    judge.add_argument("run", metavar="RUN", help="folder of a run")
    judge.add_argument("config", metavar="CONFIG", nargs="?", help="take the expectations of this file instead")
    _json(judge)
    _strict(judge)

    draw = command("draw")
    draw.add_argument("run", metavar="RUN", help="folder of a run")

    listing = command("list")
    listing.add_argument("what", metavar="WHAT", nargs="?", choices=LISTS, help=f"one of {', '.join(LISTS)}")
    _json(listing)

    new = command("new")
    new.add_argument("name", metavar="NAME", help="a starting point; `swmodel list configs` names them")

    command("schema")
    return parser


def main(arguments: Sequence[str] | None = None) -> int:
    """Run one command and return its exit code.

    Parameters
    ----------
    arguments : sequence of str, optional
        The words after the program's name; those of the process by default.
    """
    options = build_parser().parse_args(arguments)
    from . import commands

    try:
        return int(getattr(commands, f"{options.command}_command")(options))
    except SwmodelError as error:
        print(_message(error), file=sys.stderr)
        return error.exit_code
    except BrokenPipeError:
        # whoever read our output has gone (`swmodel list | head`)
        sys.stderr.close()
        return 0
    except KeyboardInterrupt:
        return 130
    except Exception:
        traceback.print_exc()
        print(
            folded("This is a fault of swmodel and not of your experiment: please report the lines above."),
            file=sys.stderr,
        )
        return MachineError.exit_code


def _message(error: SwmodelError) -> str:
    """All that is wrong, one line each, and how many."""
    faults = getattr(error, "faults", [])
    text = str(error)
    if len(faults) > 1:
        text += f"\n{len(faults)} faults; nothing was written"
    return text


def _configuration(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("config", metavar="CONFIG", help="the experiment, a TOML file")
    parser.add_argument(
        "--set",
        metavar="KEY=VALUE",
        action="append",
        default=[],
        dest="sets",
        help="another value for one key, such as frame.latitude='30 deg' or start.0.width='40 km'; may be repeated",
    )


def _json(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("--json", action="store_true", help="print JSON, for machines")


def _strict(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("--strict", action="store_true", help="count undecided as failed")
