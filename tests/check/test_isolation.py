"""The check shares nothing with the planner: imports are followed, file by file."""

from __future__ import annotations

import ast
from pathlib import Path

PACKAGE = Path(__file__).parent.parent.parent / "placer"
FORBIDDEN = (
    "placer.api",
    "placer.cli",
    "placer.placed",
    "placer.planner",
    "placer.report",
    "placer.tables",
    "placer.trial",
    "ortools",
)


def imported(path: Path) -> set[str]:
    names: set[str] = set()
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            names |= {alias.name for alias in node.names}
        elif isinstance(node, ast.ImportFrom) and node.module:
            names.add(node.module)
            names |= {f"{node.module}.{alias.name}" for alias in node.names}
    return names


def file_of(name: str) -> Path | None:
    parts = name.split(".")[1:]
    for path in (
        PACKAGE.joinpath(*parts).with_suffix(".py") if parts else PACKAGE,
        PACKAGE.joinpath(*parts, "__init__.py"),
    ):
        if path.is_file():
            return path
    return None


def reached(starts: list[Path]) -> tuple[set[str], set[Path]]:
    names: set[str] = set()
    seen: set[Path] = set()
    queue = list(starts)
    while queue:
        path = queue.pop()
        if path in seen:
            continue
        seen.add(path)
        for name in imported(path):
            names.add(name)
            if name.startswith("placer."):
                found = file_of(name)
                if found is not None:
                    queue.append(found)
    return names, seen


def test_the_check_reaches_neither_planner_nor_solver() -> None:
    names, seen = reached(sorted((PACKAGE / "check").glob("*.py")))
    assert len(seen) > 20
    for name in sorted(names):
        assert not name.startswith(FORBIDDEN), name


def test_imports_are_followed_through_other_rooms(tmp_path: Path) -> None:
    # Through the api everything is reached: the walk does not stop too early.
    probe = tmp_path / "probe.py"
    probe.write_text("from placer import api\n", encoding="utf-8")
    names, _ = reached([probe])
    assert {"placer.planner.loop", "ortools.sat.python"} <= names


def test_no_import_of_the_check_hides_in_a_call() -> None:
    for path in sorted((PACKAGE / "check").glob("*.py")):
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
            if isinstance(node, ast.ImportFrom):
                assert node.level == 0, path
            if isinstance(node, ast.Name):
                assert node.id not in ("__import__", "importlib"), path


def test_only_the_planner_imports_the_solver() -> None:
    for path in sorted(PACKAGE.rglob("*.py")):
        if "planner" in path.parts:
            continue
        assert not any(n.startswith("ortools") for n in imported(path)), path


def test_no_room_below_imports_a_room_above_the_api() -> None:
    for path in sorted(PACKAGE.rglob("*.py")):
        if path.name in ("api.py", "cli.py", "cli_compare.py", "__init__.py"):
            continue
        above = ["placer.cli"]
        if path.parent.name != "compare":
            # Comparing plans is done with whole plans: its room stands on the api.
            above += ["placer.api", "placer.compare.runs"]
        names = imported(path)
        assert not any(n.startswith(tuple(above)) for n in names), path
