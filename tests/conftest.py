"""What holds for every test: repeatable examples, and no machine but this one."""

from __future__ import annotations

import socket
import sys

from hypothesis import settings

# The same examples on every machine. No deadline: the first example may have to compile a loop.
settings.register_profile("leewater", derandomize=True, deadline=None, max_examples=50, print_blob=True)
settings.load_profile("leewater")

LOOPBACK = ("127.", "::1", "localhost")


def _refuse_other_machines(event: str, arguments: tuple) -> None:
    if event != "socket.connect" or arguments[0].family not in (socket.AF_INET, socket.AF_INET6):
        return
    host = str(arguments[1][0])
    if not host.startswith(LOOPBACK):
        raise RuntimeError(f"a test tried to reach {host}; tests work with the network cable out")


sys.addaudithook(_refuse_other_machines)
