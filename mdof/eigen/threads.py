"""Small dense problems run on one BLAS thread: handing them to several costs more than it saves."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from concurrent.futures import ThreadPoolExecutor
from contextlib import nullcontext
from functools import cache
from typing import TYPE_CHECKING, Any, TypeVar

if TYPE_CHECKING:
    from contextlib import AbstractContextManager

__all__ = ["at_once", "suited_threads"]

_Task = TypeVar("_Task")
_Result = TypeVar("_Result")

#: Coordinates below which one thread is faster; measured with OpenBLAS on two cores.
_SMALL = 200


def suited_threads(size: int) -> AbstractContextManager[Any]:
    """A context in which dense linear algebra with ``size`` coordinates uses as many threads as pay.

    The number in use before comes back afterwards.
    """
    return _controller().limit(limits=1, user_api="blas") if size < _SMALL else nullcontext()


def at_once(work: Callable[[_Task], _Result], tasks: Sequence[_Task]) -> list[_Result]:
    """Results of independent tasks in their order, as many at once as dense linear algebra had threads.

    Each task then runs on one BLAS thread: arrays that only pass through memory gain nothing from several.
    """
    workers = max((int(part["num_threads"]) for part in _controller().info() if part["user_api"] == "blas"), default=1)
    with _controller().limit(limits=1, user_api="blas"):
        if min(workers, len(tasks)) < 2:
            return [work(task) for task in tasks]
        with ThreadPoolExecutor(workers) as pool:
            return list(pool.map(work, tasks))


@cache
def _controller() -> Any:
    from threadpoolctl import ThreadpoolController

    return ThreadpoolController()
