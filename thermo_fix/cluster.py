"""Run on a Dask cluster instead of this machine's cores (extra ``cluster``)."""

from collections.abc import Iterator
from concurrent.futures import Executor
from contextlib import contextmanager

from thermo_fix.errors import FolderError

_RETRIES = 3
_PATIENCE = "20s"


@contextmanager
def cluster_executor(address: str) -> Iterator[tuple[Executor, int]]:
    """Connect to a scheduler.

    Parameters
    ----------
    address
        As the scheduler prints it: ``tcp://host:8786``.

    Yields
    ------
    tuple
        An executor, and the number of worker threads in the cluster.

    Raises
    ------
    FolderError
        The extra is not installed, no scheduler answers, or it has no workers.

    """
    # Imported here because the extra may not be installed.
    try:
        from distributed import Client
    except ImportError as error:
        raise FolderError(
            "--cluster needs the extra: pip install 'thermo-fix[cluster]', here and on the workers"
        ) from error
    try:
        client = Client(address, timeout=_PATIENCE, set_as_default=False)
    except (OSError, ValueError) as error:
        raise FolderError(
            f"--cluster {address}: no scheduler answers there; start one with "
            "'dask scheduler' and give the address that it prints"
        ) from error
    try:
        workers = sum(client.nthreads().values())
        if workers == 0:
            raise FolderError(
                f"--cluster {address}: the scheduler has no workers; start some with "
                f"'dask worker {address}'"
            )
        yield client.get_executor(retries=_RETRIES, pure=False), workers
    finally:
        client.close()
