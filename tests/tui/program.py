"""The screens on the store named on the command line, with the made-up study of conftest: run as a program."""

from __future__ import annotations

import sys
from pathlib import Path

sys.path.append(str(Path(__file__).parents[2]))

from stagebook.storage import Note, Store
from stagebook.tui.solver import Solver
from stagebook.tui.stagebook_app import StagebookApp
from tests.tui.conftest import Gates, corners, flood, nothing

if __name__ == "__main__":
    gates = Gates()
    gates.open()
    with Store.open(sys.argv[1]) as store:
        store.create("flood", flood())
        store.save("flood", Note("first try"), corners(gates, flood()))
        app = StagebookApp(store, Solver(gates.study, gates.causes_of, lambda: True, nothing, lanes=40))
        app.run()
    sys.exit(app.return_code)
