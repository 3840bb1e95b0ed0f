"""What all tests share: the folder of compiled code that the program itself would use, and the program installed."""

from __future__ import annotations

import shutil
import subprocess
import sys
import venv
from importlib import import_module
from pathlib import Path

import pytest
from hypothesis import settings

from stagebook.tui.solver_cache import choose_cache_folder, prepare_here, ready

TREE = Path(__file__).parents[1]
FOLDERS = ("engine", "storage", "tui")

choose_cache_folder()
# Tests call the laws one by one, which loaded code does not offer: imported before it, they are compiled here.
import_module("stagebook.engine.kernel.vectors")
if not ready():
    prepare_here()

# A red test must be red again tomorrow: by default the same examples each time. New ones are looked for on request,
# with --hypothesis-profile=search.
settings.register_profile("repeat", derandomize=True)
settings.register_profile("search")
settings.load_profile("repeat")


@pytest.fixture(scope="session")
def wheel(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The wheel, built from a copy of the tree: what an earlier build left behind would be packed again."""
    source = tmp_path_factory.mktemp("source")
    for folder in FOLDERS:
        shutil.copytree(TREE / folder, source / folder, ignore=shutil.ignore_patterns("__pycache__"))
    for file in ("pyproject.toml", "README.md", "LICENSE"):
        shutil.copy(TREE / file, source)
    built = tmp_path_factory.mktemp("wheel")
    _done(sys.executable, "-m", "build", "--wheel", "--outdir", str(built), str(source))
    return next(built.glob("*.whl"))


@pytest.fixture(scope="session")
def installed(wheel: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The program ``stagebook`` of an environment that holds the wheel and what it depends on, outside of the tree."""
    place = tmp_path_factory.mktemp("installed") / "venv"
    venv.create(place, with_pip=True, symlinks=True)
    _done(str(place / "bin" / "python"), "-m", "pip", "install", "--quiet", str(wheel))
    return place / "bin" / "stagebook"


def _done(*command: str) -> None:
    done = subprocess.run(command, capture_output=True, text=True, check=False)
    assert done.returncode == 0, f"{' '.join(command)}\n{done.stdout[-2000:]}{done.stderr[-2000:]}"
