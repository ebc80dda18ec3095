"""The stream function of a frame: psi with q = (d psi/dy, -d psi/dx), m3/s."""

from .boundaries import OpenBoundary
from .core import Plan, StreamFunction, stream_function
from .links import Link, LinkPath
from .misfit import Misfit
from .walls import Wall

__all__ = ["Link", "LinkPath", "Misfit", "OpenBoundary", "Plan", "StreamFunction", "Wall", "stream_function"]
