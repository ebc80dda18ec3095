"""One module a command: HELP, arguments(parser) and run(args) -> status, a few lines over ``hydro``."""

from __future__ import annotations

import argparse
import json
from pathlib import Path
from typing import Any


def write_json(where: str | None, content: dict[str, Any]) -> bool:
    """Write a command's answer as ``--json`` asks; True where it went to standard output, so that nothing else may."""
    from hydro.review import write_whole

    if not where:
        return False
    text = json.dumps(content, indent=1, allow_nan=False)
    if where == "-":
        print(text)
        return True
    write_whole(Path(where), text + "\n")
    return False


def frame_index(run, args: argparse.Namespace) -> int:
    """The frame that ``--frame`` or ``--time`` asks for; the last one without either.

    Raises ``ValueError`` for a time that is neither seconds nor a date, or a date in an undated run.
    """
    import numpy as np

    if args.time is None:
        return -1 if args.frame is None else args.frame
    try:
        return run.nearest(float(args.time))
    except ValueError:
        pass
    try:
        wanted = np.datetime64(args.time.removesuffix("Z"))
    except ValueError as error:
        raise ValueError(f"--time {args.time!r} is neither seconds nor an ISO date and time; write 600 or 2031-03-02T06:10.") from error
    if run.times.instants is None:
        raise ValueError(f"{run.name} has no dates; give --time in seconds from its start.")
    return run.nearest(float((wanted - run.times.instants[0]) / np.timedelta64(1, "ms")) / 1000)
