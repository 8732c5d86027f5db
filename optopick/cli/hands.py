"""Who does the work of a command: the options `--workers` and `--cluster`."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager
from typing import TYPE_CHECKING, Any

import click

from optopick.errors import InputError, Mistake

if TYPE_CHECKING:
    from optopick.uses.workers import Workers

# Imports stand inside the functions: --help and input errors must not wait for the numerical libraries.
# ruff: noqa: PLC0415


def workers_options(command: Callable[..., Any]) -> Callable[..., Any]:
    """Processes of this machine, or the machines of a cluster."""
    options = (
        click.option(
            "--workers",
            type=click.IntRange(min=1),
            default=None,
            metavar="N",
            help="Processes of this machine; default: one a core.",
        ),
        click.option(
            "--cluster",
            default=None,
            metavar="ADDRESS",
            help="Let a Dask cluster do the work. Example: --cluster tcp://192.0.2.7:8786",
        ),
    )
    for option in reversed(options):
        command = option(command)
    return command


@contextmanager
def hands(workers: int | None, cluster: str | None) -> Iterator[Workers | None]:
    """Those that the options name, None where they are silent.

    Raises InputError where both are given, or the cluster cannot be used.
    """
    if cluster is None:
        from optopick.uses.workers import Processes

        yield None if workers is None else Processes(workers)
        return
    if workers is not None:
        raise InputError([Mistake("--workers", f"{workers}, beside --cluster", "one of the two")])
    from optopick.uses.cluster import Cluster

    with Cluster(cluster) as found:
        yield found
