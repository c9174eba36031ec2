"""A running Dask cluster, as what tasks are handed to.

Its workers need this version of Stillroom, and the archive and its index under the same names. When one of them is lost
its tasks go to others; a task that loses several workers is given up, which is told.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from concurrent.futures import CancelledError
from contextlib import contextmanager
from importlib import import_module
from typing import Any

from archive.errors import BadRequest

__all__ = ["at_cluster"]

_SCHEME = "dask://"
_WAIT = 10  # seconds for the scheduler to answer (common practice, no source)


@contextmanager
def at_cluster(address: str) -> Iterator[tuple[Callable[..., Any], int, tuple[type[BaseException], ...]]]:
    """Give what submits a call and returns its future, how many calls run at once, and what a lost cluster raises.

    Parameters
    ----------
    address : str
        ``dask://HOST:PORT`` of the scheduler.

    Raises
    ------
    BadRequest
        If the address is none, the library is not installed, nobody answers, or there are no workers.
    """
    host = address.removeprefix(_SCHEME)
    if host in (address, ""):
        raise BadRequest(
            "the cluster's address cannot be read",
            found=address,
            expected="dask://HOST:PORT of its scheduler",
        )
    try:
        # An optional library, of which not everything is typed.
        distributed: Any = import_module("distributed")
        comm: Any = import_module("distributed.comm")
    except ImportError:
        raise BadRequest(
            "the library for Dask clusters is not installed",
            remedy="install it: pip install 'stillroom[dask]'",
        ) from None
    try:
        client = distributed.Client(f"tcp://{host}", timeout=_WAIT, set_as_default=False)
    except (OSError, ValueError) as error:
        raise BadRequest(
            "no scheduler of a Dask cluster answers there", found=address, remedy=f"see that it runs: {error}"
        ) from None
    try:
        threads = sum(client.nthreads().values())
        if threads == 0:
            raise BadRequest("the cluster has no workers", found=address, remedy="start some, then try again")

        def submit(call: Callable[..., Any], *given: Any) -> Any:
            return client.submit(call, *given, pure=False)

        yield submit, threads, (distributed.KilledWorker, CancelledError, comm.CommClosedError)
    finally:
        client.close()
