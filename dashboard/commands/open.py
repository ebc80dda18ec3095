"""leewater open: the desk in the browser."""

from __future__ import annotations

import argparse

HELP = "Open a review or a results file in the browser, on this machine only unless it is shared."


def arguments(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("path", nargs="?", default="sample_reach", metavar="REVIEW or FILE", help="default: the sample reach")
    parser.add_argument("--port", type=int, help="port on 127.0.0.1 (default: 5377, or a free one)")
    parser.add_argument("--share", action="store_true", help="let others on the network in, by links that each work once")
    parser.add_argument("--guests", type=int, default=1, metavar="N", help="with --share: how many links to print (default: 1)")
    parser.add_argument("--no-browser", action="store_true", help="only print the address")


def run(args: argparse.Namespace) -> int:
    from ..server import serve

    if args.guests < 1:
        raise ValueError(f"--guests is {args.guests}; give 1 or more, or leave --share out.")
    serve(args.path, port=args.port, browser=not args.no_browser, guests=args.guests if args.share else 0)
    return 0
