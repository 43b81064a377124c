"""How functions of this room are compiled: once, kept on disk, with numpy's rules for division.

A kept function is made anew where any file of the room changed, or one whose constants are compiled
in: numba itself looks only at the file of the function called. NUMBA_CACHE_DIR names another place.
"""

import hashlib
import math
import os
from collections.abc import Callable
from pathlib import Path
from typing import Any, TypeVar, cast

import numba
import numpy as np
from numba.core.compiler import Compiler

from engine.ages import Array

Function = TypeVar("Function", bound=Callable[..., Any])

VERSION = f"numba {numba.__version__}"
ENGINE = Path(__file__).parent.parent
FROZEN = ("compiled/*.py", "smoothing.py", "decomposition/straight.py")  # numbers compiled in

if "NUMBA_CACHE_DIR" not in os.environ:
    _files = sorted(path for pattern in FROZEN for path in ENGINE.glob(pattern))
    _digest = hashlib.sha256(b"".join(path.read_bytes() for path in _files)).hexdigest()
    _config: Any = numba.config
    _config.CACHE_DIR = str(Path(__file__).parent / "__pycache__" / _digest[:16])


class _Apart(Compiler):
    """Arrays that a function is given never overlap where it writes: no step is held back lest it
    change what the next one reads, and loops over many of them are worked on by vectors."""

    def define_pipelines(self) -> Any:
        self.state.flags.noalias = True
        pipelines: Any = super()
        return pipelines.define_pipelines()


def _made(function: Function, loosened: set[str]) -> Function:
    kept: Any = numba.njit(
        cache=True, error_model="numpy", fastmath=loosened or False, pipeline_class=_Apart
    )
    return cast(Function, kept(function))


def compiled(function: Function) -> Function:
    """Every operation rounded as it is written, as numpy does, whatever function calls it."""
    return _made(function, set())


def summing(function: Function) -> Function:
    """Sums in the order that is fastest; nothing else is loosened, and nan stays nan."""
    return _made(function, {"reassoc", "nsz"})


def fused(function: Function) -> Function:
    """A product and the sum it goes into are rounded once, together."""
    return _made(function, {"contract"})


def aligned(*shape: int) -> Array:
    """Zeros that begin where a line of the cache does, so that no vector of them lies on two."""
    size = math.prod(shape)
    room = np.zeros(size + 8)
    first = -room.ctypes.data % 64 // 8
    return room[first : first + size].reshape(shape)
