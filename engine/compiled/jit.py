"""How functions of this room are compiled: once, kept on disk, with numpy's rules for division.

A kept function is made anew where any file of the room changed, or one whose constants are compiled
in: numba itself looks only at the file of the function called. NUMBA_CACHE_DIR names another place.
"""

import hashlib
import os
from collections.abc import Callable
from pathlib import Path
from typing import Any, TypeVar, cast

import numba

Function = TypeVar("Function", bound=Callable[..., Any])

VERSION = f"numba {numba.__version__}"
ENGINE = Path(__file__).parent.parent
FROZEN = ("compiled/*.py", "smoothing.py", "decomposition/straight.py")  # numbers compiled in

if "NUMBA_CACHE_DIR" not in os.environ:
    _files = sorted(path for pattern in FROZEN for path in ENGINE.glob(pattern))
    _digest = hashlib.sha256(b"".join(path.read_bytes() for path in _files)).hexdigest()
    _config: Any = numba.config
    _config.CACHE_DIR = str(Path(__file__).parent / "__pycache__" / _digest[:16])


def compiled(function: Function) -> Function:
    """Every operation rounded as it is written, as numpy does."""
    return cast(Function, numba.njit(cache=True, error_model="numpy")(function))


def summing(function: Function) -> Function:
    """Sums in the order that is fastest; nothing else is loosened, and nan stays nan."""
    kept: Any = numba.njit(cache=True, error_model="numpy", fastmath={"reassoc", "nsz"})
    return cast(Function, kept(function))


def fused(function: Function) -> Function:
    """A product and the sum it goes into are rounded once, together."""
    kept: Any = numba.njit(cache=True, error_model="numpy", fastmath={"contract"})
    return cast(Function, kept(function))
