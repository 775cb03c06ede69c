"""The README keeps its word: every command in it runs, and every command is in it."""

from __future__ import annotations

import os
import re
import shlex
import shutil
import subprocess
import sys

import pytest

import clockgeo
from clockgeo.cli.shell import COMMANDS


@pytest.fixture(scope="module")
def readme(project):
    return (project / "README.md").read_text(encoding="utf-8")


@pytest.fixture(scope="module")
def place(project, tmp_path_factory):
    """A folder that looks like the project to a reader, but may be written to."""
    folder = tmp_path_factory.mktemp("project")
    shutil.copytree(project / "examples", folder / "examples")
    shutil.copytree(project / "grids", folder / "grids")
    return folder


def indented(readme: str) -> list[str]:
    """Lines of the README that stand for commands."""
    return [line.strip() for line in readme.splitlines() if line.startswith("    ")]


def run(place, *command):
    """Run a command as a reader would, with this very installation."""
    words = [sys.executable, "-W", "error", "-m", "clockgeo", *command]
    # A reader's terminal is neither narrow nor coloured by the tests that run around this one.
    environment = {**os.environ, "COLUMNS": "120", "NO_COLOR": "1"}
    return subprocess.run(
        words, cwd=place, capture_output=True, text=True, check=False, env=environment
    )


def test_the_two_commands_stand_alone_on_their_lines(readme):
    first, second = indented(readme)[:2]
    start = "python3 -m venv .venv && .venv/bin/pip install --quiet "
    assert first == (
        f"{start}. && .venv/bin/clockgeo level examples/saddle/campaign.toml --out results/saddle"
    )
    assert second == f"{start}'.[tests]' && .venv/bin/python -m pytest -n 2"


def test_the_main_job_runs_as_written(readme, place):
    command = indented(readme)[0].rpartition("&& .venv/bin/clockgeo ")[2]
    done = run(place, *shlex.split(command))
    assert done.returncode == 0, done.stderr
    assert {path.name for path in (place / "results" / "saddle").iterdir()} == {
        "result.json",
        "result.nc",
        "correlations.csv",
        "report.html",
    }


def test_all_other_commands_run_as_written(readme, place):
    commands = [line for line in indented(readme) if line.startswith("clockgeo ")]
    assert len(commands) > 5
    for command in commands:
        done = run(place, *shlex.split(command)[1:])
        assert done.returncode == 0, f"{command}\n{done.stderr}"
        assert done.stderr == ""


def test_every_command_is_shown(readme):
    shown = {line.split()[1] for line in indented(readme) if line.startswith("clockgeo ")}
    assert shown == set(COMMANDS)


def test_python_in_the_readme_runs(readme, place, monkeypatch, capsys):
    monkeypatch.chdir(place)
    for code in re.findall(r"```python\n(.*?)```", readme, flags=re.DOTALL):
        exec(compile(code, "README.md", "exec"), {})
    assert clockgeo.__version__ in capsys.readouterr().out


def test_the_version_to_cite_is_this_one(readme):
    assert f"clockgeo, version {clockgeo.__version__}:" in readme


def test_links_and_pictures_are_there(readme, project):
    for target in re.findall(r"\]\(([^)]+)\)", readme):
        assert (project / target).is_file(), target
