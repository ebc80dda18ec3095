"""The command line: finds the command, runs it, and turns bad input into one sentence and status 2."""

from __future__ import annotations

import argparse
import importlib
import os
import sys
import traceback

COMMANDS = (
    "begin", "open", "arrival", "eddies", "section", "trace", "drift", "passage", "change", "observed", "queries", "relation",
    "settings", "record", "pack",
)


def main(argv: list[str] | None = None) -> int:
    """Run ``leewater``: 0 done, 2 bad input, 1 our fault."""
    # A user's own setting would send the browser to other machines for its scripts.
    os.environ["BOKEH_RESOURCES"] = "server"
    arguments = list(sys.argv[1:] if argv is None else argv)
    try:
        args = _parser(arguments).parse_args(arguments)
        return int(args.run(args) or 0)
    except (ValueError, OSError) as error:
        print(f"leewater: {_sentence(error)}", file=sys.stderr)
        return 2
    except KeyboardInterrupt:
        print("leewater: stopped; what was written before stays.", file=sys.stderr)
        return 2
    except Exception:  # the one place where our own faults are reported as such
        traceback.print_exc()
        print("leewater: this is a fault of Leewater, not of your files; please report the lines above.", file=sys.stderr)
        return 1


def _parser(arguments: list[str]) -> argparse.ArgumentParser:
    """The parser; only the module of the command asked for is imported, so a start stays quick."""
    parser = argparse.ArgumentParser(prog="leewater", description="The review desk for depth-averaged 2D river models.")
    sub = parser.add_subparsers(dest="command", required=True, metavar="COMMAND")
    asked = next((a for a in arguments if not a.startswith("-")), None)
    for name in COMMANDS:
        if asked in COMMANDS and asked != name:
            continue
        module = importlib.import_module(f"dashboard.commands.{name}")
        command = sub.add_parser(name, help=module.HELP, description=module.HELP)
        module.arguments(command)
        command.set_defaults(run=module.run)
    return parser


def _sentence(error: BaseException) -> str:
    if isinstance(error, OSError) and error.filename:
        return f"{error.filename}: {error.strerror or error}; check the path."
    return str(error)
