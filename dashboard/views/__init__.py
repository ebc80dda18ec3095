"""Figures and tables: each module draws what it is given and needs no browser to be tested."""
