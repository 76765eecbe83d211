"""The table of a session does not depend on how many threads made it."""

import os
import subprocess
import sys
from pathlib import Path

import pytest

from tests.commands.program import rows_of

SESSION = Path(__file__).parents[2] / "sample_nwb" / "bramble-pons-removed.nwb"
PROGRAM = """
import sys
from unitclass.__main__ import main
sys.exit(main(["classify", *sys.argv[1:]]))
"""


def _table(folder, n_threads):
    path = folder / f"threads-{n_threads}.csv"
    algebra = dict.fromkeys(("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS"), str(n_threads))
    subprocess.run([sys.executable, "-c", PROGRAM, str(SESSION), "--table", str(path), "--quiet",
                    "--fresh"], check=True, capture_output=True, env={**os.environ, **algebra}, timeout=100)
    return rows_of(path)


def _same(one, other):
    try:
        return float(one) == pytest.approx(float(other), rel=1e-6, abs=1e-9, nan_ok=True)
    except ValueError:
        return one == other


def test_the_table_is_the_same_whatever_the_number_of_threads(tmp_path):
    alone, two = _table(tmp_path, 1), _table(tmp_path, 2)
    assert alone
    assert len(alone) == len(two)
    different = [(a["unit"], name) for a, b in zip(alone, two, strict=True) for name in a if not _same(a[name], b[name])]
    assert different == []
