"""The tools that read the code find nothing; their few rules and the reasons are in pyproject.toml."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parent.parent


@pytest.mark.parametrize("tool", [["ruff", "check", "--no-fix"], ["mypy"]], ids=["ruff", "mypy"])
def test_the_code_passes(tool):
    ran = subprocess.run([sys.executable, "-m", *tool], cwd=ROOT, capture_output=True, text=True, check=False)
    assert ran.returncode == 0, f"{ran.stdout}\n{ran.stderr}"


def test_computation_imports_no_user_interface_library():
    """hydro works from a notebook or a plain script: importing all of it loads neither the dashboard nor its libraries."""
    script = (
        "import pkgutil, sys, importlib, hydro\n"
        "for module in pkgutil.walk_packages(hydro.__path__, 'hydro.'): importlib.import_module(module.name)\n"
        "print(sorted({name.split('.')[0] for name in sys.modules}\n"
        "             & {'dashboard', 'panel', 'panel_material_ui', 'holoviews', 'bokeh', 'tornado'}))\n"
    )
    ran = subprocess.run([sys.executable, "-c", script], cwd=ROOT, capture_output=True, text=True, check=True)
    assert ran.stdout.strip() == "[]"
