"""The one lock around every open, read, write and close of a NetCDF file.

The HDF5 library is not thread-safe, not even across different files, so the stage that reads and the stage that writes
must hold the same lock. Arithmetic belongs outside it.
"""

from __future__ import annotations

import threading

NETCDF_LOCK = threading.RLock()
"""Re-entrant: a function that holds it may call another one that takes it."""
