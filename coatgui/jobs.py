"""Work in the background, and work spread over the processors.

`run_in_background` runs one function in a thread of its own, with a place to report to and a way
to be cancelled. `spread_over_processes` gives a `Spread` that shares items out among processes.
Neither knows of a window: callbacks come on the worker thread, and whoever needs them elsewhere
hands them on.
"""

from __future__ import annotations

import itertools
import os
import signal
import threading
import traceback
from collections.abc import Callable, Iterable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from multiprocessing import connection as pipes
from multiprocessing import get_context
from multiprocessing.process import BaseProcess
from typing import Any

from coatgui.progress import Cancelled, Progress, Spread

# ---------------------------------------------------------------------------------------------
# One function in the background


@dataclass(frozen=True, slots=True)
class Standing:
    """Where a job stands: `done` of `total` steps of `stage`. Before the first report the stage is
    empty and both are 0."""

    stage: str = ""
    done: int = 0
    total: int = 0


class Job:
    """A function that runs in a thread of its own; made by `run_in_background`."""

    def __init__(self, name: str) -> None:
        self.name = name
        self._wanted = True
        self._standing = Standing()
        self._finished = threading.Event()
        self._result: Any = None
        self._error: BaseException | None = None
        self._lock = threading.Lock()
        self._when_done: list[Callable[[Job], object]] = []
        self._when_progress: list[Callable[[Job], object]] = []

    @property
    def progress(self) -> Standing:
        """Where the job stands now."""
        return self._standing

    @property
    def done(self) -> bool:
        """True when the function has returned or raised; callbacks may still be running."""
        return self._finished.is_set()

    @property
    def cancelled(self) -> bool:
        """True when the job ended because it was cancelled."""
        return isinstance(self.error, Cancelled)

    @property
    def error(self) -> BaseException | None:
        """What the function raised; None where it returned or is still running."""
        return self._error if self.done else None

    @property
    def result(self) -> Any:
        """What the function returned. Raises what it raised, and RuntimeError while it runs."""
        if not self.done:
            raise RuntimeError(f"The job '{self.name}' is not done yet.")
        if self._error is not None:
            raise self._error
        return self._result

    def cancel(self) -> None:
        """Ask the function to stop; it does so where it reports next, by raising Cancelled."""
        self._wanted = False

    def wait(self, timeout_s: float | None = None) -> bool:
        """Wait until the job is done; False where the time ran out first."""
        return self._finished.wait(timeout_s)

    def add_done_callback(self, callback: Callable[[Job], object]) -> None:
        """Call `callback(job)` when the job is done, on its thread; at once where it is done."""
        with self._lock:
            if not self.done:
                self._when_done.append(callback)
                return
        callback(self)

    def add_progress_callback(self, callback: Callable[[Job], object]) -> None:
        """Call `callback(job)` at every report, on the job's thread. It should be quick."""
        with self._lock:
            self._when_progress.append(callback)

    def _report(self, stage: str, done: int, total: int) -> None:
        self._standing = Standing(stage, done, total)
        with self._lock:
            callbacks = tuple(self._when_progress)
        for callback in callbacks:
            callback(self)

    def _run(self, function: Callable[..., Any], *args: Any, **keywords: Any) -> None:
        try:
            progress = Progress(self._report, lambda: not self._wanted)
            progress.check()
            self._result = function(*args, progress=progress, **keywords)
        except BaseException as error:
            self._error = error
        with self._lock:
            self._finished.set()
            callbacks = tuple(self._when_done)
        for callback in callbacks:
            callback(self)


def run_in_background(function: Callable[..., Any], *args: Any, **keywords: Any) -> Job:
    """Start `function(*args, progress=…, **keywords)` in a thread of its own.

    The function is handed a `Progress` under the keyword `progress`, as `read_folder` and `assess`
    take it. The thread ends with the function. It does not keep the program alive: whoever ends
    the program cancels its jobs and waits for them first, if what they do should be finished.
    """
    job = Job(getattr(function, "__name__", "job"))
    threading.Thread(
        target=job._run, args=(function, *args), kwargs=keywords, name=job.name, daemon=True
    ).start()
    return job


# ---------------------------------------------------------------------------------------------
# Many items over processes

# Each process computes on one thread: with BLAS threads of their own on top, two processes run
# several times slower than one.
_ONE_THREAD = dict.fromkeys(("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS"), "1")
# Below this many items the start of the processes costs more than it brings.
_FEW = 4
# How often a wait for results looks whether the work is still wanted.
_LOOK_EVERY_S = 0.05
# More than Windows can wait for at once would not start.
_MOST_WORKERS = 60


class WorkerLost(RuntimeError):
    """A process ended without giving its result."""


def processors() -> int:
    """How many processors this process may use."""
    if hasattr(os, "sched_getaffinity"):
        return len(os.sched_getaffinity(0))
    return os.cpu_count() or 1


@contextmanager
def spread_over_processes(
    workers: int | None = None, progress: Progress | None = None
) -> Iterator[Spread]:
    """A `Spread` over `workers` processes (None: as many as there are processors).

    The processes start when there are a few items for the first time, and end with the context; at
    once where it is left by an exception, such as Cancelled. While results are waited for,
    `progress` is asked whether they are still wanted. With one worker, a few items, or where the
    system allows no processes, the items are worked on here instead.

    Functions must be importable from a module; items and results travel between processes. What a
    function raises is raised where its result would have come. WorkerLost is raised where a process
    ends unexpectedly. One spreading at a time.
    """
    number = processors() if workers is None else workers
    if number < 1:
        raise ValueError("The number of workers must be 1 or more.")
    crew = _Crew(min(number, _MOST_WORKERS), progress or Progress())
    try:
        yield crew.spread
    finally:
        crew.dismiss()


@dataclass(frozen=True)
class _Worker:
    process: BaseProcess
    pipe: Any  # our end; of another class on Windows than elsewhere


class _Crew:
    def __init__(self, size: int, progress: Progress) -> None:
        self._size = size
        self._progress = progress
        self._workers: list[_Worker] = []
        self._spreading = False
        self._busy: dict[Any, int] = {}  # pipe of each worker at work, place of its item

    def spread(self, function: Callable[[Any], Any], items: Iterable[Any], /) -> Iterator[Any]:
        if self._spreading:
            raise RuntimeError("Finish one spreading before the next is begun.")
        waiting = iter(items)
        first = list(itertools.islice(waiting, _FEW))
        everything = itertools.chain(first, waiting)
        if self._size == 1 or len(first) < _FEW or not self._gather():
            for item in everything:
                self._progress.check()
                yield function(item)
            return
        self._spreading = True
        try:
            yield from self._shared_out(function, everything)
        finally:
            self._spreading = False
            if self._busy:
                # The results of these are no longer wanted, and must not be taken for others.
                self.dismiss()

    def _shared_out(self, function: Callable[[Any], Any], items: Iterable[Any]) -> Iterator[Any]:
        """Give each idle worker the next item; yield the results in the items' order."""
        tasks = enumerate(items)
        idle = [worker.pipe for worker in self._workers]
        ready: dict[int, tuple[bool, Any]] = {}
        turn = 0
        while True:
            # Not too far ahead of the reader, so that results do not pile up.
            while idle and len(ready) + len(self._busy) < 4 * self._size:
                task = next(tasks, None)
                if task is None:
                    break
                place, item = task
                self._busy[idle[-1]] = place
                _send(idle.pop(), (function, item))
            if turn in ready:
                succeeded, value = ready.pop(turn)
                turn += 1
                if not succeeded:
                    raise value
                yield value
            elif self._busy:
                self._progress.check()
                for pipe in pipes.wait(list(self._busy), _LOOK_EVERY_S):
                    ready[self._busy[pipe]] = _receive(pipe)
                    del self._busy[pipe]
                    idle.append(pipe)
            else:
                return

    def _gather(self) -> bool:
        """Start the processes if they do not run; False where the system does not allow it."""
        if self._workers:
            return True
        context = get_context("spawn")  # the same on every system, and safe beside threads
        before = {name: os.environ.get(name) for name in _ONE_THREAD}
        os.environ.update(_ONE_THREAD)
        try:
            for _ in range(self._size):
                here, there = context.Pipe()
                process = context.Process(target=_work, args=(there,), daemon=True)
                process.start()
                there.close()
                self._workers.append(_Worker(process, here))
        except OSError:
            self.dismiss()
            return False
        finally:
            for name, value in before.items():
                if value is None:
                    del os.environ[name]
                else:
                    os.environ[name] = value
        return True

    def dismiss(self) -> None:
        """End all processes, whatever they are doing."""
        self._busy.clear()
        for worker in self._workers:
            worker.pipe.close()
            worker.process.terminate()
        for worker in self._workers:
            worker.process.join()
            worker.process.close()
        self._workers.clear()


_LOST = (
    "A worker process ended unexpectedly, perhaps for want of memory: try again with fewer workers."
)


def _send(pipe: Any, task: tuple[Callable[[Any], Any], Any]) -> None:
    try:
        pipe.send(task)
    except OSError as problem:
        raise WorkerLost(_LOST) from problem


def _receive(pipe: Any) -> tuple[bool, Any]:
    try:
        answer: tuple[bool, Any] = pipe.recv()
    except (EOFError, OSError) as problem:
        raise WorkerLost(_LOST) from problem
    except Exception as problem:  # an error of a kind that cannot be rebuilt here
        return False, RuntimeError(f"What a worker process sent cannot be read: {problem}")
    return answer


def _work(pipe: Any) -> None:
    """What a worker process does: take a function and an item, give back the outcome, until the
    other end is closed."""
    # Ctrl+C in a terminal reaches every process; the one that started us decides what it means.
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    while True:
        try:
            function, item = pipe.recv()
        except (EOFError, OSError):
            return
        answer: tuple[bool, Any]
        try:
            answer = (True, function(item))
        except Exception as error:
            error.add_note("In a worker process: " + traceback.format_exc())
            answer = (False, error)
        try:
            pipe.send(answer)
        except OSError:
            return
        except Exception:  # a result, or an error, that cannot travel
            pipe.send((False, RuntimeError(traceback.format_exc())))
