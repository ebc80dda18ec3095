"""``python -m sample_reach``: make the demonstration data, two designs side by side, going on where it was stopped."""

from __future__ import annotations

import argparse
import multiprocessing
from pathlib import Path

from hydro.review import open_review

from . import geometry as geo
from .lines import write_lines
from .make import HERE, make_design
from .observe import write_observations
from .plan import write_plan
from .review import fill_hashes


def main() -> None:
    parser = argparse.ArgumentParser(prog="python -m sample_reach", description=__doc__)
    parser.add_argument("--work", type=Path, default=HERE.parent / "build" / "sample_reach", help="folder for unfinished runs")
    parser.add_argument("--lines-only", action="store_true", help="leave the runs as they are")
    args = parser.parse_args()
    write_lines(HERE / "lines.gpkg")
    write_plan(HERE / "plan.png")
    if not args.lines_only:
        with multiprocessing.get_context("spawn").Pool(2) as pool:
            pool.starmap(make_design, [(d, args.work) for d in geo.DESIGNS], chunksize=1)
    fill_hashes(HERE / "review.toml")
    write_observations(open_review(HERE), HERE / "observed")


if __name__ == "__main__":
    main()
