"""What is locked is exact, portable and complete, and what is installed is whole."""

from __future__ import annotations

import os
import re
import tomllib
from pathlib import Path

import pytest
from packaging.requirements import Requirement
from packaging.utils import canonicalize_name

ROOT = Path(__file__).resolve().parents[2]
PROJECT = tomllib.loads((ROOT / "pyproject.toml").read_text("utf-8"))


def locked(name: str) -> dict[str, Requirement]:
    """The packages of one lock file by name."""
    lines = (ROOT / ".ci" / "locks" / name).read_text("ascii").splitlines()
    requirements = [Requirement(line) for line in lines if not line.startswith("#")]
    return {canonicalize_name(requirement.name): requirement for requirement in requirements}


@pytest.mark.parametrize("name", ["run.txt", "test.txt"])
def test_every_locked_package_has_one_exact_version_and_no_address(name):
    for requirement in locked(name).values():
        assert re.fullmatch(r"==[^*,]+", str(requirement.specifier)), requirement
        assert requirement.url is None
    assert "://" not in (ROOT / ".ci" / "locks" / name).read_text("ascii").lower()


@pytest.mark.parametrize(("declared", "files"), [("run", ["run.txt"]), ("test", ["run.txt", "test.txt"])])
def test_every_declared_dependency_is_locked_at_a_version_it_allows(declared, files):
    texts = PROJECT["project"]["dependencies"] + PROJECT["build-system"]["requires"]
    if declared == "test":
        texts = texts + PROJECT["project"]["optional-dependencies"]["test"]
    pins = {name: pin for file in files for name, pin in locked(file).items()}
    for wanted in map(Requirement, texts):
        pin = pins[canonicalize_name(wanted.name)]
        assert pin.marker is None, f"{wanted.name} is needed everywhere"
        assert wanted.specifier.contains(str(pin.specifier).removeprefix("==")), wanted


def test_no_package_is_locked_twice():
    assert not set(locked("run.txt")) & set(locked("test.txt"))


@pytest.mark.parametrize("package", ["dashboard", "hydro", "sample_reach"])
def test_every_file_that_is_not_python_is_installed_too(package):
    installed = {path for pattern in PROJECT["tool"]["setuptools"]["package-data"][package]
                 for path in (ROOT / package).glob(pattern)}
    left_out = [path for path in (ROOT / package).rglob("*")
                if path.is_file() and "__pycache__" not in path.parts and path.suffix not in (".py", ".pyc")
                and path not in installed]
    assert left_out == [], "name them in pyproject.toml, [tool.setuptools.package-data]"


@pytest.mark.skipif(os.name == "nt", reason="Windows keeps no executable bit")
def test_the_continuous_check_runs_the_same_command_as_a_person():
    run = ROOT / ".ci" / "run"
    assert os.access(run, os.X_OK)
    commands = [line for line in run.read_text("utf-8").splitlines() if line and not line.startswith(("#", "set ", "cd "))]
    assert commands == ['exec python3 -m tests "$@"']
