"""Blocks worked side by side: the same bytes whatever the number of threads, and the BLAS left as it was."""

import numpy as np
import pytest

from adjust.solver import analyse, workers
from tests.benchmarks.grid import grid_problem


def solve(problem):
    factor = analyse(problem.matrix, problem.groups, problem.positions).factorise(problem.matrix, problem.right_side)
    columns = np.arange(problem.matrix.shape[1])
    selected = factor.selected_covariance(columns, columns)
    return factor.solution.tobytes() + selected.entries.tobytes() + selected.row_variances.tobytes()


@pytest.fixture(name="threads")
def _threads(monkeypatch):
    """A BLAS of a given number of threads, as the solver sees it."""

    def pretend(count):
        state = [count]
        functions = () if count is None else ((lambda: state[0], lambda new: state.__setitem__(0, new)),)
        monkeypatch.setattr(workers, "blas_threads", lambda: functions)
        return state

    return pretend


def test_results_do_not_depend_on_the_threads(threads, monkeypatch):
    monkeypatch.setattr(workers, "FEW_COLUMNS", 0)
    problem = grid_problem(400)
    found = []
    for count in (1, 2, 5):
        threads(count)
        with workers.one_blas_thread() as allowed:
            assert allowed.count == count
        found.append(solve(problem))
    assert found[0] == found[1] == found[2]


def test_a_small_system_is_worked_by_one(threads):
    threads(4)
    for columns, count in ((workers.FEW_COLUMNS - 1, 1), (workers.FEW_COLUMNS, 4)):
        with workers.one_blas_thread(columns) as allowed:
            assert allowed.count == count


def test_an_unknown_blas_gets_no_company(threads):
    threads(None)
    with workers.one_blas_thread() as allowed:
        assert allowed.count == 1


def test_the_blas_gets_its_threads_back_even_after_an_error(threads):
    state = threads(4)

    def fail():
        with workers.one_blas_thread():
            assert state == [1]
            raise ValueError("in the middle")

    with pytest.raises(ValueError, match="in the middle"):
        fail()
    assert state == [4]


def test_every_blas_is_held_and_restored():
    threads = workers.blas_threads()
    if not threads:
        pytest.skip("NumPy and SciPy have another BLAS than the OpenBLAS of their wheels here")
    before = [read() for read, _ in threads]
    with workers.one_blas_thread():
        assert [read() for read, _ in threads] == [1] * len(threads)
    assert [read() for read, _ in threads] == before


@pytest.mark.parametrize("count", [1, 4])
def test_results_come_in_the_order_of_the_items(threads, count):
    threads(count)
    with workers.one_blas_thread() as several:
        assert several.each(lambda item: item * item, range(50)) == [item * item for item in range(50)]
