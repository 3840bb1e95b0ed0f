"""What all tests share: compiled code is kept in the folder that the program itself would use."""

from __future__ import annotations

from stagebook.tui.solver_cache import choose_cache_folder

choose_cache_folder()
