"""Tests by claim; published/ holds the checks against outside sources.

This file and those that start `python3 -m tests` import only the standard library.
"""
