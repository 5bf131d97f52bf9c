"""A Dask cluster on the loopback, started once."""

from collections.abc import Iterator
from typing import Any

import pytest


@pytest.fixture(scope="session")
def cluster() -> Iterator[Any]:
    """A scheduler with two workers in processes of their own."""
    distributed = pytest.importorskip("distributed", reason="Dask is not installed")
    with distributed.LocalCluster(
        n_workers=2, threads_per_worker=1, dashboard_address=None, host="127.0.0.1"
    ) as started:
        yield started
