"""`python3 -m dashboard [ARGS]`: `leewater ARGS` from a bare checkout, by default on the sample review."""

from __future__ import annotations

import os
import sys
from pathlib import Path

from dashboard._environment import BAD_INPUT, Checkout, NotReady, environment_for_children, hand_over, make_ready


def main(arguments: "list[str]") -> int:
    checkout = Checkout(Path(__file__).resolve().parent.parent)
    try:
        make_ready(checkout, "run")
    except NotReady as reason:
        print(reason, file=sys.stderr)
        return BAD_INPUT
    command = [str(checkout.program("leewater")), *(arguments or ["open", "sample_reach"])]
    hand_over(command, environment_for_children(checkout, os.environ))


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
