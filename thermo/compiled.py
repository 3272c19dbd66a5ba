"""One decorator for compiled kernels that is safe where nothing can be written.

``numba`` raises at import when ``cache=True`` finds no writable folder; the
kernel is then compiled anew in each process instead.
"""

from collections.abc import Callable
from typing import Any, TypeVar

import numba

F = TypeVar("F", bound=Callable[..., Any])


def kernel(function: F) -> F:
    """Compile ``function`` without the interpreter lock, cached where possible."""
    options: dict[str, Any] = {"nogil": True, "fastmath": False, "error_model": "numpy"}
    try:
        compiled: F = numba.njit(cache=True, **options)(function)
    except RuntimeError:
        compiled = numba.njit(cache=False, **options)(function)
    return compiled
