"""Both commands work, or say in one sentence why not, before anything is installed."""

from __future__ import annotations

import ast
import subprocess
import sys
import tomllib
from pathlib import Path

import pytest

from dashboard import _environment as environment
from dashboard._environment import Checkout, NotReady

ROOT = Path(__file__).resolve().parents[2]
BEFORE_THE_ENVIRONMENT = ("dashboard/__init__.py", "dashboard/__main__.py", "dashboard/_environment.py",
                          "tests/__init__.py", "tests/__main__.py", "tests/chromium.py")


@pytest.fixture
def checkout(tmp_path: Path) -> Checkout:
    """A checkout with locks and no environment."""
    (tmp_path / ".ci" / "locks").mkdir(parents=True)
    (tmp_path / "pyproject.toml").write_text("[project]\n")
    (tmp_path / ".ci" / "locks" / "run.txt").write_text("# what runs\nnumpy==2.0\nscipy==1.0\n")
    (tmp_path / ".ci" / "locks" / "test.txt").write_text("pytest==9.0\n")
    return Checkout(tmp_path)


def fill(checkout: Checkout, *levels: str) -> None:
    """Put into `checkout` what a finished installation leaves behind."""
    checkout.python.parent.mkdir(parents=True, exist_ok=True)
    checkout.python.touch()
    for level in levels:
        checkout.stamp(level).write_text(checkout.fingerprint(level))


@pytest.fixture
def no_commands(monkeypatch: pytest.MonkeyPatch) -> list[list[str]]:
    """Commands that would have been run; each succeeds."""
    ran: list[list[str]] = []

    def succeed(command):
        ran.append(list(command))
        return subprocess.CompletedProcess(command, 0, stdout="")

    monkeypatch.setattr(environment, "_quiet", succeed)
    return ran


@pytest.mark.parametrize("name", BEFORE_THE_ENVIRONMENT)
def test_only_the_standard_library_is_imported_before_the_environment_is_there(name):
    imported = set()
    for node in ast.walk(ast.parse((ROOT / name).read_text("utf-8"))):
        if isinstance(node, ast.Import):
            imported |= {alias.name for alias in node.names}
        if isinstance(node, ast.ImportFrom):
            assert node.level == 0
            imported.add(node.module)
    ours = {"dashboard._environment", "tests.chromium"}  # themselves among those checked
    assert {module.split(".")[0] for module in imported - ours} <= sys.stdlib_module_names


@pytest.mark.parametrize("module", ["dashboard.__main__", "tests.__main__"])
def test_the_commands_load_where_no_package_is_installed(module):
    """-S leaves out the folder of installed packages, -E the variables that could bring it back."""
    ran = subprocess.run([sys.executable, "-S", "-E", "-c", f"import {module}"], cwd=ROOT, capture_output=True, text=True)
    assert (ran.returncode, ran.stderr) == (0, "")


@pytest.mark.parametrize("name", BEFORE_THE_ENVIRONMENT)
def test_an_older_python_can_read_what_tells_it_that_it_is_too_old(name):
    ast.parse((ROOT / name).read_text("utf-8"), feature_version=(3, 7))


def test_an_older_python_is_named_together_with_what_is_needed():
    with pytest.raises(NotReady, match=r"^Python 3\.10 is too old for Leewater; .* Python 3\.11 or newer\.$"):
        environment.check_python((3, 10))
    environment.check_python((3, 11))
    environment.check_python((3, 14))


def test_the_oldest_python_is_the_one_that_the_project_declares():
    declared = tomllib.loads((ROOT / "pyproject.toml").read_text("utf-8"))["project"]["requires-python"]
    assert declared == ">={}.{}".format(*environment.OLDEST_PYTHON)


@pytest.mark.parametrize("lacking", ["venv", "ensurepip"])
def test_a_missing_module_is_named_and_how_to_get_it(lacking):
    with pytest.raises(NotReady) as told:
        environment.check_venv_modules(lambda name: None if name == lacking else object())
    assert lacking in str(told.value)
    assert "apt install python3-venv" in str(told.value)
    assert len(str(told.value).splitlines()) == 1


def test_programs_are_where_each_system_keeps_them(tmp_path):
    posix, windows = Checkout(tmp_path, windows=False), Checkout(tmp_path, windows=True)
    assert posix.program("leewater") == tmp_path / ".venv" / "bin" / "leewater"
    assert posix.python == tmp_path / ".venv" / "bin" / "python"
    assert windows.program("leewater") == tmp_path / ".venv" / "Scripts" / "leewater.exe"
    assert windows.python == tmp_path / ".venv" / "Scripts" / "python.exe"


def test_a_filled_environment_is_used_at_once_and_nothing_is_said(checkout, no_commands, capsys):
    fill(checkout, "run")
    environment.make_ready(checkout, "run")
    assert no_commands == []
    assert capsys.readouterr().out == ""


def test_the_first_start_makes_the_environment_from_the_locks_and_says_so_in_one_line(checkout, no_commands, capsys):
    checkout.venv.mkdir()
    environment.make_ready(checkout, "run")
    made, locked, project = no_commands
    assert made[1:] == ["-m", "venv", "--clear", str(checkout.venv)]
    assert locked[-2:] == ["--requirement", str(checkout.root / ".ci" / "locks" / "run.txt")]
    assert project[-2:] == ["--editable", str(checkout.root)]
    assert {"--no-deps", "--no-build-isolation"} <= set(project)
    said = capsys.readouterr().out.splitlines()
    assert len(said) == 1
    assert "2 locked packages" in said[0] and "minutes" in said[0]
    assert not checkout.is_ready("test")


def test_an_environment_that_somebody_else_made_is_filled_and_not_made_again(checkout, no_commands, capsys):
    fill(checkout)
    environment.make_ready(checkout, "test")
    assert not any("--clear" in command for command in no_commands)
    assert [word for command in no_commands for word in command if word.endswith(".txt")] == [
        str(checkout.root / ".ci" / "locks" / "run.txt"), str(checkout.root / ".ci" / "locks" / "test.txt")]
    assert "3 locked packages" in capsys.readouterr().out
    assert checkout.is_ready("test")
    assert checkout.is_ready("run"), "the test environment holds what the other command needs"


@pytest.mark.parametrize(
    ("changed", "stale"),
    [(".ci/locks/run.txt", {"run", "test"}), (".ci/locks/test.txt", {"test"}), ("pyproject.toml", {"run", "test"})],
)
def test_a_changed_lock_makes_stale_what_was_installed_from_it(checkout, changed, stale):
    fill(checkout, "run", "test")
    path = checkout.root / changed
    path.write_text(path.read_text() + "another==1.0\n")
    assert {level for level in ("run", "test") if not checkout.is_ready(level)} == stale


def test_line_endings_of_a_checkout_are_no_change(checkout):
    fill(checkout, "run")
    lock = checkout.root / ".ci" / "locks" / "run.txt"
    lock.write_bytes(lock.read_bytes().replace(b"\n", b"\r\n"))
    assert checkout.is_ready("run")


def test_a_moved_checkout_is_installed_again(checkout, tmp_path):
    fill(checkout, "run")
    moved = tmp_path / "elsewhere"
    moved.mkdir()
    for name in (".venv", ".ci", "pyproject.toml"):
        (tmp_path / name).rename(moved / name)
    assert not Checkout(moved).is_ready("run")


def test_an_installation_that_fails_leaves_no_stamp_and_tells_the_reason(checkout, monkeypatch):
    fill(checkout, "run")
    lock = checkout.root / ".ci" / "locks" / "run.txt"
    lock.write_text("nowhere==1.0\n")

    def fail(command):
        failed = "install" in command
        return subprocess.CompletedProcess(command, int(failed), stdout="WARNING: retrying\nERROR: No route to host\nbye\n")

    monkeypatch.setattr(environment, "_quiet", fail)
    with pytest.raises(NotReady, match=r"\(ERROR: No route to host\); check the network and .* run this command again\.$"):
        environment.make_ready(checkout, "run")
    assert not checkout.stamp("run").exists()
    lock.write_text("# what runs\nnumpy==2.0\nscipy==1.0\n")
    assert not checkout.is_ready("run"), "half of another lock may be installed"


def test_a_folder_that_cannot_be_written_gets_a_sentence(checkout, monkeypatch):
    def fail(command):
        return subprocess.CompletedProcess(command, 1, stdout="Error: [Errno 13] Permission denied: '.venv'\n")

    monkeypatch.setattr(environment, "_quiet", fail)
    with pytest.raises(NotReady, match="could not be made .*Permission denied"):
        environment.make_ready(checkout, "run")


def test_a_program_that_is_not_there_is_a_failure_and_no_traceback(tmp_path):
    assert environment._quiet([str(tmp_path / "nothing")]).returncode == 1


def test_children_keep_compiled_loops_in_the_environment_and_scripts_on_this_machine(checkout):
    child = environment.environment_for_children(checkout, {"BOKEH_RESOURCES": "cdn", "HOME": "h"})
    assert child == {"BOKEH_RESOURCES": "server", "HOME": "h", "NUMBA_CACHE_DIR": str(checkout.venv / "compiled")}
    chosen = environment.environment_for_children(checkout, {"NUMBA_CACHE_DIR": "mine"})
    assert chosen["NUMBA_CACHE_DIR"] == "mine"


@pytest.mark.parametrize("module", ["dashboard", "tests"])
def test_a_command_that_cannot_start_says_one_sentence_and_exits_with_2(module):
    script = (
        "import sys, importlib\n"
        f"command = importlib.import_module('{module}.__main__')\n"
        "def refuse(checkout, level): raise command.NotReady('Ask for a network.')\n"
        "command.make_ready = refuse\n"
        "sys.exit(command.main([]))\n"
    )
    ran = subprocess.run([sys.executable, "-c", script], cwd=ROOT, capture_output=True, text=True)
    assert (ran.returncode, ran.stdout, ran.stderr) == (2, "", "Ask for a network.\n")


@pytest.mark.skipif(sys.platform == "win32", reason="Windows starts a child instead of becoming it")
def test_the_status_of_the_command_is_the_status(tmp_path):
    script = ("import sys; from dashboard._environment import hand_over;"
              "hand_over([sys.executable, '-c', 'import os, sys; sys.exit(int(os.environ[\"STATUS\"]))'], {'STATUS': '5'})")
    assert subprocess.run([sys.executable, "-c", script], cwd=ROOT).returncode == 5
