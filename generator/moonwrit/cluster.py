"""A Dask cluster, where one is asked for; the extra ``cluster`` brings the library."""

from __future__ import annotations

from typing import Any

from moonwrit.errors import RequestError


def connected(scheduler: str) -> Any:
    """A client of the cluster at an address, to be used as a context. Raises RequestError where none can be had."""
    try:
        from distributed import Client
    except ImportError:
        raise RequestError("--scheduler needs the extra cluster", "pip install 'moonwrit[cluster]'") from None
    try:
        return Client(scheduler, timeout=20)  # type: ignore[no-untyped-call, unused-ignore]
    except (OSError, ValueError) as fault:
        raise RequestError(f"no Dask scheduler answers at {scheduler} ({fault})",
                           "start one, or give its address, such as tcp://host:8786") from None


__all__ = ["connected"]
