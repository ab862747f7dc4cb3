"""Small dense problems run on one BLAS thread: handing them to several costs more than it saves."""

from __future__ import annotations

from contextlib import nullcontext
from functools import cache
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from contextlib import AbstractContextManager

__all__ = ["suited_threads"]

#: Coordinates below which one thread is faster; measured with OpenBLAS on two cores.
_SMALL = 200


def suited_threads(size: int) -> AbstractContextManager[Any]:
    """A context in which dense linear algebra with ``size`` coordinates uses as many threads as pay.

    The number in use before comes back afterwards.
    """
    return _controller().limit(limits=1, user_api="blas") if size < _SMALL else nullcontext()


@cache
def _controller() -> Any:
    from threadpoolctl import ThreadpoolController

    return ThreadpoolController()
