"""Tests that drive the dashboard in a real Chromium."""
