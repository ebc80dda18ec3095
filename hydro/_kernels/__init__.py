"""Compiled inner loops over plain arrays. They trust their input; the modules above check it."""
