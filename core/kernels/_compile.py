"""How every numba loop of this package is compiled.

The settings are the same everywhere: the interpreter lock is released, arithmetic is plain IEEE
(never reordered, so that results are the same bit for bit and their bounds hold), arrays are not
bounds-checked, and a division by zero gives infinity or NaN as numpy does.

Machine code is kept between runs where numba finds a folder it may write to.  Where it finds
none, or the disk is full, kernels still work and are compiled afresh in every process;
:func:`cache_message` says so.
"""

from __future__ import annotations

import sys
from collections.abc import Callable
from pickle import UnpicklingError
from typing import Any

from numba import njit

from kingpost.core.kernels import settings as chosen

_message: str | None = None


def kernel(**options: Any) -> Callable[[Callable[..., Any]], Any]:
    """Decorator: compile a function over flat arrays; ``options`` go to ``numba.njit``."""
    settings = {"nogil": True, "error_model": "numpy", "boundscheck": False, **options}

    def decorate(function: Callable[..., Any]) -> Any:
        try:
            compiled = njit(cache=True, **settings)(function)
        except RuntimeError as error:  # numba: "cannot cache function", no folder to write to
            if "cannot cache" not in str(error):
                raise
            _remember("no folder for compiled code can be written to")
            return njit(**settings)(function)
        _forgive(compiled)
        return compiled

    return decorate


def _leave_out_blas() -> None:
    try:
        import numba.np.linalg as linalg

        found = linalg.ensure_blas
    except (ImportError, AttributeError):  # another version of numba: nothing to spare
        return

    def missing() -> None:
        raise ImportError("BLAS is not looked for")

    linalg.ensure_blas = missing
    try:
        import numba.np.arraymath  # noqa: F401
    finally:
        linalg.ensure_blas = found


if not chosen.look_for_blas and "scipy.linalg" not in sys.modules:
    _leave_out_blas()


def cache_message() -> str | None:
    """Why compiled code is not kept between runs, as one sentence; None where it is kept."""
    return _message


def _remember(reason: str) -> None:
    global _message
    if _message is None:
        _message = (
            f"compiled code is not kept between runs ({reason}), so every start takes some seconds "
            "longer; set NUMBA_CACHE_DIR to a folder that can be written to"
        )


def _forgive(compiled: Any) -> None:
    # numba lets an error of the cache's files (disk full, a folder gone, a damaged index) end
    # the call of the kernel itself, although the code is compiled and ready by then.  And when
    # two processes compile one kernel for different types at once, the index of one can come to
    # point at the code of the other: what is loaded must be what was asked for.
    cache = getattr(compiled, "_cache", None)
    load = getattr(cache, "load_overload", None)
    save = getattr(cache, "save_overload", None)
    if cache is None or load is None or save is None:
        return

    def guarded_load(signature: Any, *rest: Any) -> Any:
        found = _guarded(load, signature, *rest)
        wanted = getattr(signature, "args", signature)
        if found is not None and tuple(found.signature.args) != tuple(wanted):
            return None
        return found

    def guarded_save(*arguments: Any) -> None:
        _guarded(save, *arguments)

    cache.load_overload = guarded_load
    cache.save_overload = guarded_save


def _guarded(action: Callable[..., Any], *arguments: Any) -> Any:
    try:
        return action(*arguments)
    except (OSError, EOFError, ValueError, UnpicklingError) as error:
        _remember(f"{type(error).__name__}: {error}")
        return None
