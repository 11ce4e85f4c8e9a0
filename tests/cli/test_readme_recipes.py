"""README's recipes: valid by the schemas of their hosts, and their shell parts keep their word."""

from __future__ import annotations

import json
import os
import re
import shutil
import subprocess
import sys
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import pytest
import yaml

from splitcheck.cli.targets import FORMATS

ROOT = Path(__file__).parents[2]
README = (ROOT / "README.md").read_text(encoding="utf-8")
FIXTURES = ROOT / "fixtures"
pytestmark = pytest.mark.slow
MANIFEST = ROOT / ".pre-commit-hooks.yaml"


def recipe(name: str) -> str:
    """The block of README under a mark."""
    found = re.search(rf"<!-- recipe: {name} -->\n```\w+\n(.*?)```\n", README, re.DOTALL)
    assert found is not None
    return found[1]


def git(folder: Path, *words: str) -> str:
    """Run git as nobody in particular."""
    names = ("-c", "user.name=n", "-c", "user.email=n@example.org", "-c", "commit.gpgsign=false")
    done = subprocess.run(
        ["git", *names, *words], cwd=folder, check=True, capture_output=True, text=True
    )
    return done.stdout


@pytest.fixture
def repository(tmp_path: Path) -> Path:
    """A clone whose origin/main has the clean board, with the faulty one on a branch."""
    missing = [name for name in ("git", "bash") if shutil.which(name) is None]
    if missing:
        pytest.skip(f"the hosts' scripts need {' and '.join(missing)}")
    origin, clone = tmp_path / "origin", tmp_path / "clone"
    shutil.copytree(FIXTURES / "demo_clean", origin / "gerbers")
    git(origin, "init", "-q", "-b", "main")
    git(origin, "add", ".")
    git(origin, "commit", "-q", "-m", "clean")
    git(tmp_path, "clone", "-q", str(origin), str(clone))
    git(clone, "checkout", "-q", "-b", "change")
    shutil.rmtree(clone / "gerbers")
    shutil.copytree(FIXTURES / "demo", clone / "gerbers")
    git(clone, "add", ".")
    git(clone, "commit", "-q", "-m", "faulty")
    return clone


@pytest.fixture
def environment(tmp_path: Path) -> dict[str, str]:
    """Commands of these names come first: splitcheck from here, and a pip that installs nothing."""
    commands = tmp_path / "bin"
    commands.mkdir()
    (commands / "splitcheck").write_text(
        f'#!/bin/sh\nexec "{sys.executable}" -m splitcheck "$@"\n', encoding="utf-8"
    )
    (commands / "python").write_text('#!/bin/sh\n[ "$1 $2" = "-m pip" ]\n', encoding="utf-8")
    for command in commands.iterdir():
        command.chmod(0o755)
    known = {key: os.environ[key] for key in ("HOME", "LANG", "TMPDIR") if key in os.environ}
    path = f"{commands}{os.pathsep}{os.environ['PATH']}"
    return {**known, "PATH": path, "PYTHONPATH": str(ROOT), "SPLITCHECK": "nothing.whl"}


def shell(text: str, folder: Path, environment: Mapping[str, str]) -> tuple[int, str]:
    """Run a script as the hosts do, with the shell stopping at the first failure."""
    done = subprocess.run(
        ["bash", "-e", "-c", text],
        cwd=folder,
        env=dict(environment),
        check=False,
        capture_output=True,
        text=True,
    )
    assert "Traceback" not in done.stderr
    return done.returncode, done.stdout


@pytest.mark.parametrize(
    ("name", "schema"), [("github", "vendor.github-workflows"), ("gitlab", "vendor.gitlab-ci")]
)
def test_pipelines_are_valid_by_the_schemas_of_their_hosts(
    tmp_path: Path, name: str, schema: str
) -> None:
    """As the package ``check-jsonschema`` carries them."""
    file = tmp_path / f"{name}.yml"
    file.write_text(recipe(name), encoding="utf-8")
    words = [sys.executable, "-m", "check_jsonschema", "--builtin-schema", schema, str(file)]
    done = subprocess.run(words, check=False, capture_output=True, text=True)
    assert done.returncode == 0, done.stdout


@pytest.mark.parametrize("name", FORMATS)
def test_every_format_has_a_row(name: str) -> None:
    """What ``--out`` can write is explained."""
    assert f"\n| `{name}` | " in README.split("### Formats")[1].split("### Recipes")[0]


def test_a_kept_report_lets_old_faults_pass(repository: Path, environment: dict[str, str]) -> None:
    """The two plain lines: keep one, compare, and nothing is new."""
    keep, compare = (line for line in recipe("shell").splitlines() if line)
    assert shell(keep, repository, environment)[0] == 0
    code, said = shell(compare, repository, environment)
    assert code == 0
    assert "Passed" in said


def test_two_revisions_in_git_show_what_is_new(
    repository: Path, environment: dict[str, str]
) -> None:
    """The clean board was on main."""
    code, said = shell(recipe("git"), repository, environment)
    assert code == 1
    assert "tide-logger, 0 findings" in said


def workflow() -> dict[str, Any]:
    """The workflow's job."""
    job: dict[str, Any] = yaml.safe_load(recipe("github"))["jobs"]["gate"]
    return job


def github(repository: Path, environment: dict[str, str], base: str) -> tuple[int, str]:
    """Run every shell step of the workflow; its expressions are in ``env`` alone."""
    summary = repository / "step-summary.md"
    code, said = 0, ""
    for step in workflow()["steps"]:
        if "run" in step:
            assert "${{" not in step["run"], "what others write may not get into a script"
            more = {"BASE": base, "GITHUB_STEP_SUMMARY": str(summary)}
            code, out = shell(step["run"], repository, environment | more)
            said += out
    return code, said


def test_the_github_workflow_fails_and_tells_where(
    repository: Path, environment: dict[str, str]
) -> None:
    """Annotations on standard output, the summary where the host looks, SARIF for the upload."""
    code, said = github(repository, environment, "main")
    assert code == 1
    assert all(line.startswith("::") for line in said.splitlines())
    assert "::error file=gerbers/tide-logger-L4-bottom.gbr,line=" in said
    assert "New or worse" in (repository / "step-summary.md").read_text(encoding="utf-8")
    upload = next(step for step in workflow()["steps"] if "upload" in step.get("uses", ""))
    sarif = json.loads((repository / upload["with"]["sarif_file"]).read_text(encoding="utf-8"))
    states = {result["baselineState"] for result in sarif["runs"][0]["results"]}
    assert states == {"new"}


def test_the_github_workflow_passes_on_main_and_on_a_first_run(
    repository: Path, environment: dict[str, str]
) -> None:
    """A push has no base; a base without exports is no fault either."""
    assert github(repository, environment, "")[0] == 0
    empty = git(repository, "commit-tree", "-m", "empty", git(repository, "mktree").strip())
    git(repository, "update-ref", "refs/remotes/origin/empty", empty.strip())
    assert github(repository, environment, "empty")[0] == 0


def test_the_gitlab_job_leaves_both_reports(repository: Path, environment: dict[str, str]) -> None:
    """Where its artefacts say, whether it fails or passes."""
    job = yaml.safe_load(recipe("gitlab"))["return-paths"]
    kept = "splitcheck rank {} --fail-at never --quiet --out json=baseline.json"
    for board, expected in ((FIXTURES / "demo_clean", 1), (Path("gerbers"), 0)):
        assert shell(kept.format(board), repository, environment)[0] == 0
        assert shell("\n".join(job["script"]), repository, environment)[0] == expected
        reports = job["artifacts"]["reports"]
        assert "<testsuites" in (repository / reports["junit"]).read_text(encoding="utf-8")
        rows = json.loads((repository / reports["codequality"]).read_text(encoding="utf-8"))
        assert (repository / rows[0]["location"]["path"]).is_file()
        assert set(job["artifacts"]["paths"]) == set(reports.values())


def test_the_hook_is_one(tmp_path: Path) -> None:
    """By the own checks of the program that reads it, and README uses its name."""
    config = tmp_path / ".pre-commit-config.yaml"
    config.write_text(recipe("pre-commit"), encoding="utf-8")
    for what, file in (("manifest", MANIFEST), ("config", config)):
        words = [sys.executable, "-m", "pre_commit", f"validate-{what}", str(file)]
        done = subprocess.run(words, check=False, capture_output=True, text=True)
        assert done.returncode == 0, done.stdout
    (hook,) = yaml.safe_load(MANIFEST.read_text(encoding="utf-8"))
    (used,) = yaml.safe_load(recipe("pre-commit"))["repos"][0]["hooks"]
    assert hook["id"] == used["id"]
    for name in ("a.gbr", "gerbers/b.GTL", "b.g2", "c.drl", "x/splitcheck.toml", "job.gbrjob"):
        assert re.search(hook["files"], name), name
    for name in ("README.md", "board.kicad", "gbr.py"):
        assert not re.search(hook["files"], name), name


@pytest.mark.parametrize(("board", "passes"), [("demo", False), ("demo_clean", True)])
def test_the_hook_runs(
    repository: Path, environment: dict[str, str], board: str, *, passes: bool
) -> None:
    """As a local hook, so that nothing is installed; all else is as the manifest says."""
    (hook,) = yaml.safe_load(MANIFEST.read_text(encoding="utf-8"))
    (used,) = yaml.safe_load(recipe("pre-commit"))["repos"][0]["hooks"]
    local = {**hook, **used, "language": "system"}
    config = {"repos": [{"repo": "local", "hooks": [local]}]}
    (repository / ".pre-commit-config.yaml").write_text(yaml.safe_dump(config), encoding="utf-8")
    clean = f"splitcheck rank {FIXTURES / 'demo_clean'} --quiet --out json=baseline.json"
    assert shell(clean, repository, environment)[0] == 0
    shutil.rmtree(repository / "gerbers")
    shutil.copytree(FIXTURES / board, repository / "gerbers")
    git(repository, "add", ".")
    home = {"PRE_COMMIT_HOME": str(repository.parent / "cache")}
    run = f'"{sys.executable}" -m pre_commit run --all-files'
    code, said = shell(run, repository, environment | home)
    assert (code == 0) is passes, said
    assert ("Failed: " in said) is not passes
