"""`python3 -m tests [ARGS]`: the whole suite from a bare checkout; ARGS go to pytest."""

from __future__ import annotations

import os
import sys
from pathlib import Path

from dashboard._environment import BAD_INPUT, Checkout, NotReady, environment_for_children, hand_over, make_ready
from tests.chromium import VARIABLE, chromium

WORKERS = 2


def pytest_arguments(arguments: "list[str]") -> "list[str]":
    """`arguments` with two workers, unless they already say how many or ask for the debugger."""
    own = ("-n", "--numprocesses", "--pdb", "--trace", "--dist")
    if any(argument.startswith(own) for argument in arguments):
        return list(arguments)
    return ["-n", str(WORKERS), *arguments]


def main(arguments: "list[str]") -> int:
    checkout = Checkout(Path(__file__).resolve().parent.parent)
    try:
        make_ready(checkout, "test")
        browser = chromium(checkout.python, os.environ)
    except NotReady as reason:
        print(reason, file=sys.stderr)
        return BAD_INPUT
    environ = environment_for_children(checkout, os.environ)
    environ[VARIABLE] = str(browser)
    print(f"Running the tests with {browser}: some minutes; the first run compiles the inner loops too.", flush=True)
    hand_over([str(checkout.python), "-m", "pytest", *pytest_arguments(arguments)], environ)


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
