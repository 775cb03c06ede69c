"""The house keeps its order: layers, file lengths, style, types, and honest raises."""

from __future__ import annotations

import re
import shutil
import subprocess
import sys

import pytest

LONGEST_FILE = 400
TOP_LEVEL = {
    "README.md",
    "DEVELOPERS.md",
    "pyproject.toml",
    "LICENSE",
    "clockgeo",
    "tests",
    "grids",
    "examples",
}


def run(project, *command):
    done = subprocess.run(command, cwd=project, capture_output=True, text=True, check=False)
    return done.returncode, done.stdout + done.stderr


def sources(project):
    return [*project.glob("clockgeo/**/*.py"), *project.glob("tests/**/*.py")]


def test_no_file_is_too_long(project):
    long = {
        str(path.relative_to(project)): count
        for path in sources(project)
        if (count := len(path.read_text(encoding="utf-8").splitlines())) > LONGEST_FILE
    }
    assert not long, f"split these files, {LONGEST_FILE} lines at most: {long}"


def test_every_raises_matches_its_message(project):
    call = re.compile(r"pytest\.raises\((?:[^()]|\([^()]*\))*\)")
    loose = [
        f"{path.name}: {found}"
        for path in project.glob("tests/**/*.py")
        for found in call.findall(path.read_text(encoding="utf-8"))
        if "match=" not in found and path.name != "test_house.py"
    ]
    assert not loose, loose


def test_the_top_level_is_as_agreed(project):
    if not (project / ".git").exists() or shutil.which("git") is None:
        pytest.skip("not a git checkout")
    _, listed = run(project, "git", "ls-files")
    tops = {line.split("/")[0] for line in listed.splitlines() if not line.startswith(".")}
    assert tops <= TOP_LEVEL


def test_layers_are_kept(project):
    code, said = run(
        project, sys.executable, "-c", "from importlinter.cli import lint_imports_command as c; c()"
    )
    assert code == 0, said


def test_style_is_kept(project):
    code, said = run(project, sys.executable, "-m", "ruff", "check", "clockgeo", "tests")
    assert code == 0, said
    code, said = run(
        project, sys.executable, "-m", "ruff", "format", "--check", "clockgeo", "tests"
    )
    assert code == 0, said


def test_types_are_kept(project):
    code, said = run(project, sys.executable, "-m", "mypy")
    assert code == 0, said
