"""Long columns worked on in pieces that stay in the processor's cache."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np

from tausheet.functions.exact import Array

_BLOCK = 32768
"""Elements worked on at a time, so that what lies between stays in the processor's cache."""


def in_blocks(compute: Callable[..., None], *arguments: Any) -> Array:
    """An element-wise computation, in blocks where its arguments are long columns.

    `compute` puts its result into its first argument.
    """
    shape = np.broadcast_shapes(*(np.shape(a) for a in arguments))
    out = np.empty(shape)
    if out.size <= _BLOCK or any(np.shape(a) not in ((), shape) for a in arguments):
        compute(out, *arguments)
        return out
    whole = out.reshape(-1)
    flat = [np.asarray(a) if np.shape(a) == () else np.asarray(a).ravel() for a in arguments]
    for start in range(0, out.size, _BLOCK):
        part = slice(start, start + _BLOCK)
        compute(whole[part], *(a if a.ndim == 0 else a[part] for a in flat))
    return out
