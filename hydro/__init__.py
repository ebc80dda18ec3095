"""Leewater's computation: results of depth-averaged 2D river models in, figures out.

Nothing here imports a user-interface library, so a notebook gets any number that a screen shows.
"""

__version__ = "0.1.0"
