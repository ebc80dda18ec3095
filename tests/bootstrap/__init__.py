"""Tests of what runs before anything is installed."""
