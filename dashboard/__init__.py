"""The page, its views and the command line.

This file and those that start the two commands import only the standard library, so that
`python3 -m dashboard` works before anything is installed.
"""
