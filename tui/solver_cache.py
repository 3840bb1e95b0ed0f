"""Where the compiled solver is kept, whether it is there, and the child process that makes it.

The folder holds machine code that is loaded and run: it is the user's own, mode 0700. :func:`ready` loads what is
there; where it comes before anything that computes, the compiler is never imported.
"""

from __future__ import annotations

import atexit
import gc
import hashlib
import os
import platform
import shutil
import subprocess
import sys
import tempfile
from dataclasses import dataclass
from importlib.metadata import PackageNotFoundError, version
from pathlib import Path

from platformdirs import user_cache_path

_KERNEL = Path(__file__).parents[1] / "engine" / "kernel"
_VARIABLE = "NUMBA_CACHE_DIR"
_CODE = "solver.code"


@dataclass(frozen=True, slots=True)
class CacheFolder:
    """The folder for compiled code. ``path`` is None where nothing is compiled; ``words`` say what the user waits for.

    ``lasting`` is False for a private temporary folder, which goes with the process that made it.
    """

    path: Path | None
    lasting: bool
    words: str | None


def choose_cache_folder() -> CacheFolder:
    """The cache folder of this user, solver and compiler; numba and its children are pointed to it.

    The folder's name is a hash over all sources of the kernel (which imports no other part of the engine), the numba
    and the Python version: numba does not notice a change of a function that another file calls. A folder that an
    earlier call or the parent process chose stays.
    """
    os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
    compiler = _compiler()
    if compiler is None:
        return CacheFolder(
            None, False, "numba is not used here: the same solver runs uncompiled, some 100 times slower"
        )
    key = solver_key(_KERNEL, compiler)
    chosen = Path(os.environ.get(_VARIABLE, ""))
    if chosen.name == key and _is_private(chosen):
        return CacheFolder(chosen, chosen.parent == _home(), None)
    folder = _home() / key
    try:
        folder.mkdir(mode=0o700, parents=True, exist_ok=True)
        folder.chmod(0o700)
        _try_to_write(folder)
        words = None if _is_private(folder) else f"{folder} belongs to somebody else"
    except OSError as error:
        words = f"{folder} cannot be written ({error.strerror})"
    if words is None:
        os.environ[_VARIABLE] = str(folder)
        return CacheFolder(folder, True, None)
    private = Path(tempfile.mkdtemp(prefix="stagebook-"))
    atexit.register(shutil.rmtree, private, ignore_errors=True)
    folder = private / key
    folder.mkdir(mode=0o700)
    os.environ[_VARIABLE] = str(folder)
    return CacheFolder(folder, False, f"{words}: the solver is compiled anew each time")


def ready() -> bool:
    """Whether computing can start at once: the compiled solver is loaded now, or nothing is compiled here."""
    from ..engine.kernel import machine_code

    folder = choose_cache_folder().path
    if folder is None or machine_code.loaded():
        return True
    try:
        machine_code.adopt((folder / _CODE).read_bytes())
    except (OSError, ValueError):
        return False
    return True


def prepare() -> subprocess.Popen[bytes]:
    """Start the child process that fills the cache, at low priority; ``poll()`` tells when it is done (0 is good).

    The child lives on when the program is left early: what it compiled is there the next time.
    """
    choose_cache_folder()
    return subprocess.Popen(
        [sys.executable, "-P", "-m", "stagebook.tui.preparing"],
        stdin=subprocess.DEVNULL,
        stdout=subprocess.DEVNULL,
        stderr=subprocess.DEVNULL,
        start_new_session=True,
    )


def prepare_here() -> None:
    """Compile the whole solver in this process, load it and keep it. Raises OSError where it cannot be kept."""
    from ..engine.kernel import machine_code

    folder = choose_cache_folder().path
    if folder is None:
        return
    # Imported here: it loads numba.
    from ..engine.kernel.compiling import compiled_code

    # Looking for cycles among the millions of objects of a compiler is a sixth of its time, and finds nothing.
    collected = gc.isenabled()
    gc.disable()
    try:
        code = compiled_code()
    finally:
        if collected:
            gc.enable()
    machine_code.adopt(code)
    # Whole or not at all: another process may look for it at any time.
    handle, written = tempfile.mkstemp(dir=folder)
    try:
        with os.fdopen(handle, "wb") as file:
            file.write(code)
        os.replace(written, folder / _CODE)
    except OSError:
        Path(written).unlink(missing_ok=True)
        raise


def solver_key(sources: Path, compiler: str) -> str:
    """Sixteen hexadecimal digits that change with any source file, the compiler and the interpreter."""
    digest = hashlib.sha256(f"{compiler} {sys.implementation.cache_tag} {platform.machine()}".encode())
    for file in sorted(sources.rglob("*.py")):
        digest.update(f"\n{file.relative_to(sources)}\n".encode())
        digest.update(file.read_bytes())
    return digest.hexdigest()[:16]


def _compiler() -> str | None:
    """Name and version of the compiler; None where the kernel runs as plain Python."""
    if os.environ.get("STAGEBOOK_UNCOMPILED"):
        return None
    try:
        return f"numba {version('numba')}"
    except PackageNotFoundError:
        return None


def _home() -> Path:
    return user_cache_path("stagebook") / "solver"


def _is_private(folder: Path) -> bool:
    """Whether the folder is really one, is ours and is open to nobody else."""
    if os.name != "posix":
        return folder.is_dir()
    try:
        state = folder.lstat()
    except OSError:
        return False
    return folder.is_dir() and not folder.is_symlink() and state.st_uid == os.getuid() and not state.st_mode & 0o077


def _try_to_write(folder: Path) -> None:
    with tempfile.TemporaryFile(dir=folder):
        pass
