"""What pyproject promises is what the tree holds: a package that is not listed is silently missing from the wheel."""

from __future__ import annotations

import importlib
import subprocess
import tomllib
import zipfile
from pathlib import Path
from typing import Any

import pytest

from .conftest import FOLDERS, TREE


@pytest.fixture(scope="module")
def project() -> dict[str, Any]:
    return tomllib.loads((TREE / "pyproject.toml").read_text(encoding="utf-8"))


def test_every_package_of_the_tree_is_listed(project: dict[str, Any]) -> None:
    found = {
        ".".join(("stagebook", *file.parent.relative_to(TREE).parts))
        for folder in FOLDERS
        for file in (TREE / folder).rglob("__init__.py")
    }
    listed = project["tool"]["setuptools"]["packages"]
    assert sorted(listed) == sorted(found)


def test_every_folder_with_code_is_a_package() -> None:
    code = {file.parent for folder in FOLDERS for file in (TREE / folder).rglob("*.py")}
    assert [folder for folder in sorted(code) if not (folder / "__init__.py").exists()] == []


def test_every_data_file_of_the_tree_is_listed(project: dict[str, Any]) -> None:
    patterns = project["tool"]["setuptools"]["package-data"]
    left_out = []
    for folder in FOLDERS:
        for file in (TREE / folder).rglob("*"):
            if file.is_dir() or file.suffix in (".py", ".pyc") or "__pycache__" in file.parts:
                continue
            package = ".".join(("stagebook", *file.parent.relative_to(TREE).parts))
            if not any(file.match(pattern) for pattern in (*patterns.get("*", ()), *patterns.get(package, ()))):
                left_out.append(str(file.relative_to(TREE)))
    assert left_out == []


def test_the_program_can_be_called(project: dict[str, Any]) -> None:
    module, _, function = project["project"]["scripts"]["stagebook"].partition(":")
    assert callable(getattr(importlib.import_module(module), function))


def test_nothing_is_put_into_the_top_level_of_site_packages(project: dict[str, Any]) -> None:
    assert all(name.startswith("stagebook.") for name in project["tool"]["setuptools"]["packages"])
    assert set(project["tool"]["setuptools"]["package-dir"]) == {f"stagebook.{folder}" for folder in FOLDERS}


def test_the_wheel_holds_every_file_of_the_tree_and_no_other(wheel: Path) -> None:
    with zipfile.ZipFile(wheel) as packed:
        found = {name for name in packed.namelist() if ".dist-info/" not in name}
    tree = {
        f"stagebook/{file.relative_to(TREE).as_posix()}"
        for folder in FOLDERS
        for file in (TREE / folder).rglob("*")
        if file.is_file() and "__pycache__" not in file.parts
    }
    assert found == tree


def test_the_installed_program_knows_its_version(installed: Path, project: dict[str, Any]) -> None:
    done = subprocess.run([installed, "--version"], cwd="/", env={}, capture_output=True, text=True, check=True)
    assert done.stdout == f"stagebook {project['project']['version']}\n"
