"""leewater open: the desk in the browser."""

from __future__ import annotations

import argparse

HELP = "Open a review or a results file in the browser, on this machine only."


def arguments(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("path", nargs="?", default="sample_reach", metavar="REVIEW or FILE", help="default: the sample reach")
    parser.add_argument("--port", type=int, help="port on 127.0.0.1 (default: 5377, or a free one)")
    parser.add_argument("--no-browser", action="store_true", help="only print the address")


def run(args: argparse.Namespace) -> int:
    from ..server import serve

    serve(args.path, port=args.port, browser=not args.no_browser)
    return 0
