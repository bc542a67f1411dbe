"""What holds for the whole test run."""

from __future__ import annotations

import atexit
import os
import shutil
import tempfile

# A compiled function that an earlier run left behind must not pass for the one under test: the compiler's cache only
# sees changes of the file itself. Set before anything imports numba, and inherited by the programs the tests start.
_CACHE = tempfile.mkdtemp(prefix="bemt-tests-numba-")
os.environ["NUMBA_CACHE_DIR"] = _CACHE
atexit.register(shutil.rmtree, _CACHE, ignore_errors=True)
