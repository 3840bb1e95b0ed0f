"""The child process that compiles the solver once for this machine: ``python -m stagebook.tui.preparing``."""

from __future__ import annotations

import os

from .solver_cache import prepare_here

if __name__ == "__main__":
    if hasattr(os, "nice"):
        os.nice(19)
    prepare_here()
