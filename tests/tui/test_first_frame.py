"""What the first frame waits for: nothing heavy."""

from __future__ import annotations

import subprocess
import sys


def test_the_application_is_imported_without_the_heavy_libraries():
    code = (
        "import sys, kingpost.tui.app\n"
        "heavy = {'numpy', 'pyarrow', 'scipy', 'numba', 'networkx', 'duckdb'} & set(sys.modules)\n"
        "print(sorted(heavy))"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"
