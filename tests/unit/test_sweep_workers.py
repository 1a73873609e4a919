"""Sweeps by other processes, threads and a cluster: the same rows, bit by bit."""

import io
import os
import sys
from concurrent.futures import Future, ThreadPoolExecutor

import pandas as pd
import pytest

import bandwright as bw
from bandwright.errors import SolveError, StackError
from bandwright.sweeps.progress import Progress
from bandwright.sweeps.running import worker_count
from sweeps import wells

OVER = {"width": "4..10 count 40", "x": [0.2, 0.3, 1.3]}
METRICS = ["levels_found", "level_1_meV", "wavelength_um", "dipole_nm"]


@pytest.fixture(scope="module")
def alone():
    return bw.sweep(wells.well, OVER, metrics=METRICS, chunk=17)


def test_processes(alone, tmp_path):
    path = tmp_path / "wells.csv"
    table = bw.sweep(wells.well, OVER, metrics=METRICS, chunk=17, workers=2, results=path)
    pd.testing.assert_frame_equal(table, alone, check_exact=True)
    designs = pd.read_csv(path, comment="#")["design"]
    assert sorted(designs) == list(range(1, 121))


def test_a_stack_in_processes():
    over = {"well.thickness": "5 nm..8 nm count 60"}
    one = bw.sweep(wells.well(6.0), over)
    two = bw.sweep(wells.well(6.0), over, workers=2)
    pd.testing.assert_frame_equal(one, two, check_exact=True)


def test_any_executor(alone):
    with ThreadPoolExecutor(2) as executor:
        table = bw.sweep(wells.well, OVER, metrics=METRICS, chunk=17, executor=executor)
        pd.testing.assert_frame_equal(table, alone, check_exact=True)


class Counting:
    """An executor that does the work when somebody waits, and counts what is unfinished."""

    def __init__(self):
        self.waiting, self.most = 0, 0

    def submit(self, function, *arguments):
        self.waiting += 1
        self.most = max(self.most, self.waiting)
        future = Future()
        future.add_done_callback(lambda _: None)
        future.set_result(function(*arguments))
        self.waiting -= 1
        return future


def test_no_more_chunks_are_in_work_than_workers(alone):
    executor = Counting()
    table = bw.sweep(wells.well, OVER, metrics=METRICS, chunk=17, executor=executor, workers=3)
    pd.testing.assert_frame_equal(table, alone, check_exact=True)
    assert executor.most == 1


def test_how_many_chunks_an_executor_is_given():
    assert worker_count(4, None) == 4
    with ThreadPoolExecutor(3) as executor:
        assert worker_count(1, executor) == 3
        assert worker_count(5, executor) == 5
    assert worker_count(1, Counting()) == os.cpu_count()


def test_a_cluster(alone):
    distributed = pytest.importorskip("distributed")
    cluster = distributed.LocalCluster(
        n_workers=2, threads_per_worker=1, processes=True, dashboard_address=None,
        worker_dashboard_address=None,
    )  # fmt: skip
    with cluster, distributed.Client(cluster) as client:
        executor = client.get_executor()
        assert worker_count(1, executor) == 2
        table = bw.sweep(wells.well, OVER, metrics=METRICS, chunk=17, executor=executor)
    pd.testing.assert_frame_equal(table, alone, check_exact=True)


def test_what_can_not_be_sent():
    over = {"width": [5, 6]}
    with pytest.raises(
        StackError, match=r"design: can't be sent to other processes .*; give a func"
    ):
        bw.sweep(lambda width: wells.well(width), over, workers=2)
    with pytest.raises(StackError, match="metric 'n': can't be sent to other processes"):
        bw.sweep(wells.well, over, metrics={"n": lambda s: 1}, workers=2)


def test_a_function_from_a_prompt(monkeypatch):
    monkeypatch.setattr(wells.well, "__module__", "__main__")
    main = sys.modules["__main__"]
    monkeypatch.setattr(main, "well", wells.well, raising=False)
    monkeypatch.delattr(main, "__file__", raising=False)
    with pytest.raises(StackError, match="design: is defined in an interactive session"):
        bw.sweep(wells.well, {"width": [5, 6]}, workers=2)


def test_a_worker_that_dies():
    with pytest.raises(
        SolveError, match="a worker process ended before its work; in a script, put"
    ):
        bw.sweep(Deadly(os.getpid()), {"width": [5, 6]}, workers=2)


class Deadly:
    """Makes a well in this process and ends any other."""

    def __init__(self, home):
        self.home = home

    def __call__(self, width):
        if os.getpid() != self.home:
            os._exit(3)
        return wells.well(width)


# -- the bar ----------------------------------------------------------------------------------


class Terminal(io.StringIO):
    def isatty(self):
        return True


def test_the_bar_is_for_terminals(monkeypatch, capsys):
    wide = {"width": "4..10 count 40"}
    bw.sweep(wells.well, wide, metrics=["levels_found"])
    assert capsys.readouterr().err == ""
    screen = Terminal()
    monkeypatch.setattr(sys, "stderr", screen)
    with Progress(10, 2, shown=True) as bar:
        bar._bar.delay = 0.0
        bar._bar.mininterval = 0.0
        bar.forward(4)
        bar._bar.refresh()
    assert "6/10" in screen.getvalue()
    screen = Terminal()
    monkeypatch.setattr(sys, "stderr", screen)
    for shown, done in ((False, 0), (True, 10)):
        with Progress(10, done, shown) as bar:
            bar.forward(1)
    assert screen.getvalue() == ""
