"""The shape of the project: what lies where, what is pinned, what the guides must name."""

import re
import subprocess
import sys
import tomllib
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

PROJECT = Path(__file__).parents[1]
LOCKS = [Path("requirements.lock"), Path("tests/requirements.lock")]
TOP_LEVEL = {
    "DEVELOPERS.md",
    "Dockerfile",
    "LICENSE",
    "README.md",
    "deploy",
    "pyproject.toml",
    "requirements.lock",
    "schemas",
    "service",
    "tests",
}

# Each is broken up, so that this file may hold them.
REGISTRY_HOSTS = [r"py[p]i\.org", r"python[h]osted", r"npm[j]s\.", r"deb\.[d]ebian"]
NOWHERE = {
    "a path of one machine": r"/(?:r[o]ot|h[o]me|w[o]rk)/\w",
    "the host of a package registry": "|".join(REGISTRY_HOSTS),
    "unfinished work": r"\b(?:TO[D]O|FIX[M]E|XX[X])\b",
}
VAGUE = {"common", "helpers", "manager", "misc", "utils"}


def project_files() -> list[Path]:
    """What git tracks or would track; in a copy without history, every file outside dot folders."""
    if (PROJECT / ".git").exists():
        listed = subprocess.run(
            ["git", "ls-files", "--cached", "--others", "--exclude-standard", "-z"],
            cwd=PROJECT,
            check=True,
            capture_output=True,
            text=True,
        ).stdout
        paths = [Path(name) for name in listed.split("\0") if name]
        return [path for path in paths if (PROJECT / path).is_file()]
    return [path.relative_to(PROJECT) for path in _walk(PROJECT)]


def _walk(folder: Path) -> Iterator[Path]:
    for entry in folder.iterdir():
        if entry.is_file():
            yield entry
        elif entry.name == ".ci" or not entry.name.startswith((".", "__pycache__")):
            yield from _walk(entry)


def project_table() -> dict[str, Any]:
    return tomllib.loads((PROJECT / "pyproject.toml").read_text("utf-8"))


def direct_dependencies() -> list[str]:
    table = project_table()
    declared = [*table["project"]["dependencies"], *table["build-system"]["requires"]]
    for group in table["dependency-groups"].values():
        declared += group
    return sorted({re.split(r"[<>=!~;\s\[]", line, maxsplit=1)[0] for line in declared})


def pins() -> dict[str, str]:
    text = "".join((PROJECT / lock).read_text("utf-8") for lock in LOCKS)
    return dict(re.findall(r"^([a-z0-9-]+)==(\S+)", text, re.MULTILINE))


def test_the_top_level_holds_only_the_fixed_files_and_dotfiles() -> None:
    present = {path.parts[0] for path in project_files()}
    assert {name for name in present if not name.startswith(".")} == TOP_LEVEL


def test_no_module_has_a_name_that_says_nothing() -> None:
    names = {path.with_suffix("").name: path for path in project_files() if path.suffix == ".py"}
    folders = {part for path in project_files() for part in path.parts[:-1]}
    assert not VAGUE & (names.keys() | folders)


@pytest.mark.parametrize("what", NOWHERE)
def test_no_file_holds(what: str) -> None:
    pattern = re.compile(NOWHERE[what])
    texts = ((path, (PROJECT / path).read_bytes()) for path in project_files())
    found = [
        f"{path}: {match[0]}"
        for path, content in texts
        for match in pattern.finditer(content.decode("utf-8", "replace"))
    ]
    assert not found


@pytest.mark.parametrize("lock", LOCKS, ids=str)
def test_a_lock_holds_versions_and_digests_and_nothing_else(lock: Path) -> None:
    lines = (PROJECT / lock).read_text("utf-8").splitlines()
    pin = re.compile(r"[a-z0-9-]+==[\w.]+( ; [\w\s.'!=<>]+)? \\")
    digest = re.compile(r"    --hash=sha256:[0-9a-f]{64}( \\)?")
    assert [line for line in lines if not pin.fullmatch(line) and not digest.fullmatch(line)] == []


def test_every_dependency_is_pinned() -> None:
    assert [name for name in direct_dependencies() if name not in pins()] == []


def test_no_package_is_pinned_in_both_locks() -> None:
    run_time, tests = ((PROJECT / lock).read_text("utf-8") for lock in LOCKS)
    names = re.compile(r"^([a-z0-9-]+)==", re.MULTILINE)
    assert not set(names.findall(run_time)) & set(names.findall(tests))


def test_the_developers_guide_says_why_each_dependency_is_there_and_lists_no_other() -> None:
    guide = (PROJECT / "DEVELOPERS.md").read_text("utf-8")
    section = guide.split("\n## Dependencies\n")[1].split("\n## ")[0]
    rows = re.findall(r"^\| (\S+) \| \S.{10,} \|$", section, re.MULTILINE)
    assert sorted(set(rows) - {"package"}) == direct_dependencies()


def test_the_developers_guide_names_every_setting_and_no_other() -> None:
    guide = (PROJECT / "DEVELOPERS.md").read_text("utf-8")
    section = guide.split("\n## Settings\n")[1].split("\n## ")[0]
    rows = re.findall(
        r"^\| `(\w+)` \| `(--[a-z-]+)` \| \S.* \| \S.{10,} \|$", section, re.MULTILINE
    )
    assert rows == [(f"WIDEBERTH_{flag[2:].replace('-', '_').upper()}", flag) for _, flag in rows]
    assert {flag for _, flag in rows} == serve_flags()


def serve_flags() -> set[str]:
    shown = subprocess.run(
        [sys.executable, "-c", "from service.cli import main; main()", "serve", "--help"],
        cwd=PROJECT,
        check=True,
        capture_output=True,
        text=True,
    ).stdout
    return set(re.findall(r"--[a-z-]+", shown)) - {"--help"}


def test_the_readme_opens_with_the_two_commands_and_both_exist() -> None:
    commands = re.findall(r"^sh (\S+)", (PROJECT / "README.md").read_text("utf-8"), re.MULTILINE)
    assert commands[:2] == ["deploy/demo.sh", "tests/run.sh"]
    assert all((PROJECT / command).is_file() for command in commands)


def test_the_guides_link_only_to_files_that_exist() -> None:
    guides = [path for path in project_files() if path.suffix == ".md"]
    links = [
        (guide, target)
        for guide in guides
        for target in re.findall(r"\]\(([^)#:]+)", (PROJECT / guide).read_text("utf-8"))
    ]
    assert [link for link in links if not (PROJECT / link[0].parent / link[1]).exists()] == []
