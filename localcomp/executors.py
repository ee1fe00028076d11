"""Where work runs: this process, a pool over the machine's cores, or a Dask cluster."""

from __future__ import annotations

import os
import sys
import threading
import time
from collections.abc import Iterator
from concurrent.futures import BrokenExecutor, Executor, Future, ProcessPoolExecutor
from contextlib import contextmanager
from multiprocessing import get_context
from typing import Any

from localcomp.errors import BadInput, Problem

SINGLE_THREAD = ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS", "VECLIB_MAXIMUM_THREADS")
CONNECT_SECONDS = 20
WATCH_SECONDS = 0.5
STUCK_SECONDS = 3.0


class SerialExecutor(Executor):
    """Runs each task at once in this process; for one worker and for tests."""

    def submit(self, fn: Any, /, *args: Any, **kwargs: Any) -> Future[Any]:
        """Run now; the future is done when it returns."""
        future: Future[Any] = Future()
        try:
            future.set_result(fn(*args, **kwargs))
        except Exception as error:  # a future carries its error to whoever asks for the result
            future.set_exception(error)
        return future


@contextmanager
def pool(workers: int) -> Iterator[Executor]:
    """A process pool with single-threaded linear algebra; workers die with their parent."""
    before = {name: os.environ.get(name) for name in SINGLE_THREAD}
    os.environ.update(dict.fromkeys(SINGLE_THREAD, "1"))
    try:
        executor = ProcessPoolExecutor(
            workers, mp_context=get_context("spawn"), initializer=_die_with_parent, initargs=(os.getpid(),)
        )
        done = threading.Event()
        threading.Thread(target=_watch_workers, args=(executor, done), daemon=True).start()
        try:
            yield executor
        finally:
            try:
                executor.shutdown(wait=True, cancel_futures=True)
            finally:
                done.set()
    finally:
        for name, value in before.items():
            if value is None:
                os.environ.pop(name, None)
            else:
                os.environ[name] = value


def worker_deaths() -> tuple[type[BaseException], ...]:
    """What a future raises when the workers that ran it died."""
    if "distributed" not in sys.modules:
        return (BrokenExecutor,)
    from distributed.scheduler import KilledWorker  # a batch that took several workers with it

    return (BrokenExecutor, KilledWorker)


def _watch_workers(executor: ProcessPoolExecutor, done: threading.Event) -> None:
    """Break a pool that a dead worker has left hanging.

    A worker that is killed while it writes a result leaves half a message in a pipe that the pool then
    waits on for ever. A pool that notices a death breaks at once; one that is still there `STUCK_SECONDS`
    later never will, so its workers and the pipe are closed here.
    While the pool shuts down that means: a worker still busy with what nobody waits for is ended.
    """
    since: float | None = None
    while not done.wait(WATCH_SECONDS):
        # the executor says nothing in public about its workers; an executor without these names goes unwatched
        workers = list((getattr(executor, "_processes", None) or {}).values())
        if all(worker.is_alive() for worker in workers):
            since = None
        elif since is None:
            since = time.monotonic()
        elif time.monotonic() - since > STUCK_SECONDS:
            for worker in workers:
                worker.kill()
            queue = getattr(executor, "_result_queue", None)  # the pipe's last open end is the pool's own
            if queue is not None:
                queue._writer.close()
            since = None  # and again, should another worker have started meanwhile


def _die_with_parent(parent: int) -> None:
    """Leave when the process that started this worker is gone (killed, say): nobody waits for the result."""
    import signal

    signal.signal(signal.SIGINT, signal.SIG_IGN)  # the parent decides what Ctrl-C means

    def watch() -> None:
        while os.getppid() == parent:
            time.sleep(0.5)
        os._exit(1)

    threading.Thread(target=watch, daemon=True).start()


@contextmanager
def cluster(address: str) -> Iterator[Executor]:
    """The workers of a running Dask scheduler.

    Raises
    ------
    BadInput
        If `distributed` is not installed or the scheduler does not answer.
    """
    try:
        from distributed import Client
    except ImportError:
        raise BadInput(
            [Problem("command line", "--cluster", address, "needs the extra: pip install 'localcomp[cluster]'")]
        ) from None
    try:
        client = Client(address, timeout=CONNECT_SECONDS, set_as_default=False)
    except (OSError, ValueError, TimeoutError) as error:
        raise BadInput(
            [Problem("command line", "--cluster", address, f"no scheduler answers there ({error})")]
        ) from None
    try:
        yield client.get_executor(pure=False, retries=5)
    finally:
        client.close()
