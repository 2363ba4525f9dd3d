"""Background jobs and spreading. Worker processes cannot import test modules, so what they are
given are functions of the standard library."""

import math
import multiprocessing
import operator
import os
import threading
import time
from collections.abc import Iterator

import pytest

from coatgui import jobs
from coatgui.jobs import Job, Standing, WorkerLost, run_in_background, spread_over_processes
from coatgui.progress import Cancelled, Progress

PATIENCE_S = 60.0


@pytest.fixture(autouse=True)
def _nothing_is_left_behind() -> Iterator[None]:
    before = set(threading.enumerate())
    yield
    for thread in set(threading.enumerate()) - before:
        thread.join(PATIENCE_S)
        assert not thread.is_alive()
    assert multiprocessing.active_children() == []


# Jobs


def test_a_job_gives_its_result() -> None:
    def add(a: int, b: int, *, progress: Progress) -> int:
        progress.at("adding", 1, 2)
        return a + b

    job = run_in_background(add, 1, b=2)
    assert job.wait(PATIENCE_S)
    assert (job.done, job.result, job.error, job.cancelled) == (True, 3, None, False)
    assert job.progress == Standing("adding", 1, 2)
    assert job.name == "add"


def test_a_job_gives_its_error() -> None:
    def fail(*, progress: Progress) -> None:
        raise KeyError("x")

    job = run_in_background(fail)
    assert job.wait(PATIENCE_S)
    assert isinstance(job.error, KeyError)
    with pytest.raises(KeyError):
        _ = job.result


def test_a_running_job_has_no_result_and_can_be_cancelled() -> None:
    begun = threading.Event()

    def work(*, progress: Progress) -> None:
        for step in range(1_000_000):
            progress.at("working", step, 1_000_000)
            begun.set()
            time.sleep(0.001)

    job = run_in_background(work)
    assert begun.wait(PATIENCE_S)
    assert (job.done, job.error, job.cancelled) == (False, None, False)
    with pytest.raises(RuntimeError, match="not done"):
        _ = job.result
    job.cancel()
    assert job.wait(PATIENCE_S)
    assert job.cancelled
    with pytest.raises(Cancelled):
        _ = job.result


def test_callbacks_come_on_the_jobs_thread() -> None:
    go_on = threading.Event()
    seen: list[tuple[str, threading.Thread, Standing]] = []
    finished = threading.Event()

    def work(*, progress: Progress) -> threading.Thread:
        go_on.wait(PATIENCE_S)
        progress.at("one", 1, 2)
        progress.at("two", 2, 2)
        return threading.current_thread()

    def at_the_end(job: Job) -> None:
        assert job.done
        seen.append(("done", threading.current_thread(), job.progress))
        finished.set()

    job = run_in_background(work)
    job.add_progress_callback(
        lambda j: seen.append(("step", threading.current_thread(), j.progress))
    )
    job.add_done_callback(at_the_end)
    go_on.set()
    assert finished.wait(PATIENCE_S)
    worker = job.result
    assert worker is not threading.current_thread()
    assert seen == [
        ("step", worker, Standing("one", 1, 2)),
        ("step", worker, Standing("two", 2, 2)),
        ("done", worker, Standing("two", 2, 2)),
    ]
    # Where the job is done already, the callback comes at once, here.
    late: list[threading.Thread] = []
    job.add_done_callback(lambda _: late.append(threading.current_thread()))
    assert late == [threading.current_thread()]


# Spreading


def test_results_come_in_order_from_other_processes() -> None:
    with spread_over_processes(2) as spread:
        assert list(spread(math.sqrt, range(40))) == [math.sqrt(k) for k in range(40)]
        workers = multiprocessing.active_children()
        assert len(workers) == 2
        # A slow item first does not let the others overtake it.
        assert list(spread(time.sleep, [0.2, 0, 0, 0, 0, 0])) == [None] * 6
        # The processes stay for the next use.
        assert set(multiprocessing.active_children()) == set(workers)


def test_each_process_computes_on_one_thread(monkeypatch: pytest.MonkeyPatch) -> None:
    names = ["OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS", "COATGUI_ELSE"]
    monkeypatch.setenv("OMP_NUM_THREADS", "7")
    monkeypatch.delenv("MKL_NUM_THREADS", raising=False)
    monkeypatch.delenv("OPENBLAS_NUM_THREADS", raising=False)
    with spread_over_processes(2) as spread:
        assert list(spread(os.getenv, names)) == ["1", "1", "1", None]
        # Here everything is as before.
        assert [os.environ.get(name) for name in names] == [None, "7", None, None]


def test_few_items_or_one_worker_stay_here() -> None:
    with spread_over_processes(2) as spread:
        assert list(spread(operator.neg, [1, 2, 3])) == [-1, -2, -3]
        assert list(spread(lambda item: item, iter([]))) == []
        assert multiprocessing.active_children() == []
    with spread_over_processes(1) as spread:
        # A lambda could not travel.
        assert list(spread(lambda item: item + 1, range(20))) == list(range(1, 21))
        assert multiprocessing.active_children() == []


def test_where_no_process_can_start_the_work_is_done_here(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    class NoProcesses:
        Pipe = staticmethod(multiprocessing.get_context("spawn").Pipe)

        def Process(self, **_: object) -> None:
            raise OSError("no processes here")

    monkeypatch.setattr(jobs, "get_context", lambda _: NoProcesses())
    with spread_over_processes(2) as spread:
        assert list(spread(lambda item: item + 1, range(20))) == list(range(1, 21))


def test_items_are_drawn_as_they_are_needed() -> None:
    drawn = []

    def items() -> Iterator[int]:
        for number in range(1000):
            drawn.append(number)
            yield number

    with spread_over_processes(2) as spread:
        results = spread(operator.neg, items())
        assert [next(results) for _ in range(5)] == [0, -1, -2, -3, -4]
        assert len(drawn) < 30
        # What is left of it must not turn up in the next spreading.
        with pytest.raises(RuntimeError, match="one spreading"):
            next(spread(math.sqrt, range(10)))
        results.close()  # type: ignore[attr-defined]
        assert list(spread(math.sqrt, [4] * 10)) == [2.0] * 10


def test_an_error_comes_where_its_result_would_have() -> None:
    with spread_over_processes(2) as spread:
        results = spread(math.sqrt, [4, 9, -1, 16, 25, 36])
        assert [next(results), next(results)] == [2.0, 3.0]
        with pytest.raises(ValueError, match=r"math domain error|nonnegative") as problem:
            next(results)
        assert "worker process" in problem.value.__notes__[0]
        assert list(spread(math.sqrt, [1] * 6)) == [1.0] * 6


def test_what_cannot_travel_is_an_error_too() -> None:
    result = "lambda: 0"
    error = "(_ for _ in ()).throw(type('Odd', (Exception,), {})('x'))"
    # An error that can be sent but not rebuilt, as its constructor wants more than its message.
    module = "__import__('urllib.error').error"
    unbuildable = f"(_ for _ in ()).throw({module}.ContentTooShortError('x', b''))"
    with spread_over_processes(2) as spread:
        for expression in (result, error, unbuildable):
            with pytest.raises(RuntimeError):
                list(spread(eval, [expression] * 6))
        with pytest.raises((TypeError, AttributeError)):
            list(spread(math.sqrt, [threading.Lock()] * 6))
        assert list(spread(math.sqrt, [1] * 6)) == [1.0] * 6


def test_a_process_that_ends_is_noticed() -> None:
    with spread_over_processes(2) as spread:
        with pytest.raises(WorkerLost, match="fewer workers"):
            list(spread(os._exit, [0] * 6))
        assert list(spread(math.sqrt, [1] * 6)) == [1.0] * 6


def test_cancelling_ends_the_processes_at_once() -> None:
    asked = []

    def cancelled() -> bool:
        asked.append(True)
        return len(asked) > 3

    # The items would take hours; that this test ends shows that nobody waits for them.
    with pytest.raises(Cancelled), spread_over_processes(2, Progress(None, cancelled)) as spread:
        list(spread(time.sleep, [3600] * 6))
    assert multiprocessing.active_children() == []


def test_a_reader_that_is_cancelled_ends_the_processes() -> None:
    def read() -> None:
        with spread_over_processes(2) as spread:
            for _ in spread(time.sleep, [0, 3600, 3600, 3600, 3600]):
                raise Cancelled

    with pytest.raises(Cancelled):
        read()
    assert multiprocessing.active_children() == []


def test_it_works_in_a_background_job() -> None:
    def work(*, progress: Progress) -> list[float]:
        with spread_over_processes(2, progress) as spread:
            return list(spread(math.sqrt, [4.0] * 8))

    job = run_in_background(work)
    assert job.wait(PATIENCE_S)
    assert job.result == [2.0] * 8


def test_a_wrong_number_of_workers() -> None:
    with pytest.raises(ValueError, match="1 or more"), spread_over_processes(0):
        pass
    assert jobs.processors() >= 1
