"""Speed on the reference round, as ratios in one run. Run with ``make bench``."""

import time

import numpy as np
import pytest
from reference import (
    DURATION,
    START,
    STORED,
    inert,
    ours,
    right_hand_side,
    right_hand_side_with_steel,
    round_section,
    steel,
)
from scipy.integrate import solve_ivp
from scipy.sparse import diags, kron

pytestmark = pytest.mark.bench


def _timed(work, repeat=5):  # type: ignore[no-untyped-def]
    best, out = np.inf, None
    for _ in range(repeat):
        begin = time.process_time()
        out = work()
        best = min(best, time.process_time() - begin)
    return best, out


def _table(capsys, title, rows):  # type: ignore[no-untyped-def]
    base = rows[1][1]
    with capsys.disabled():
        print(f"\n{title}: CPU relative to ours at 0.05 K, largest error against a fine run [K]")
        for name, seconds, error in rows:
            print(f"  {name:28} {seconds / base:8.2f} x  {error:8.3f} K   ({seconds:.3f} s)")


def test_the_round_against_the_method_of_lines(capsys: pytest.CaptureFixture[str]) -> None:
    body, material = round_section(), inert()
    n = body.n_node
    slope = right_hand_side(body)
    band = diags([np.ones(n - 1), np.ones(n), np.ones(n - 1)], [-1, 0, 1])
    ours(body, material, tolerance=1.0)  # compile
    truth = ours(body, material, tolerance=2e-4).field
    rows = []
    for tolerance in (0.2, 0.05, 0.02):
        seconds, out = _timed(lambda tol=tolerance: ours(body, material, tolerance=tol))
        rows.append((f"ours, tolerance {tolerance} K", seconds, np.abs(out.field - truth).max()))

    def peer(method: str, rtol: float):  # type: ignore[no-untyped-def]
        options = {"lband": 1, "uband": 1} if method == "LSODA" else {"jac_sparsity": band}
        return solve_ivp(
            slope, (0.0, DURATION), np.full(n, START), method=method, t_eval=STORED,
            rtol=rtol, atol=rtol * 100.0, **options,
        )  # fmt: skip

    for method, rtol in (("BDF", 1e-4), ("BDF", 1e-5), ("LSODA", 1e-4), ("LSODA", 1e-5)):
        seconds, out = _timed(lambda m=method, r=rtol: peer(m, r), repeat=1)
        rows.append((f"solve_ivp {method}, rtol {rtol:g}", seconds, np.abs(out.y.T - truth).max()))
    _table(capsys, "round, 200 cells, 4 h, inert", rows)
    assert rows[1][2] < 0.2


def test_the_transforming_round_against_the_method_of_lines(
    capsys: pytest.CaptureFixture[str],
) -> None:
    body = round_section()
    n = body.n_node
    material, start, carbon = steel()
    slope = right_hand_side_with_steel(body, material, carbon)
    # Each node's five unknowns see themselves and the temperature of the neighbours.
    near = diags([np.ones(n - 1), np.ones(n), np.ones(n - 1)], [-1, 0, 1])
    pattern = kron(np.ones((5, 5)), near)

    def us(tolerance: float):  # type: ignore[no-untyped-def]
        return ours(body, material, tolerance=tolerance, start=start, carbon_pct=carbon)

    us(1.0)
    truth = us(5e-4).field
    rows = []
    for tolerance in (0.2, 0.05, 0.02):
        seconds, out = _timed(lambda tol=tolerance: us(tol))
        rows.append((f"ours, tolerance {tolerance} K", seconds, np.abs(out.field - truth).max()))
    y0 = np.concatenate([np.full(n, START), np.zeros(4 * n)])

    def peer(rtol: float):  # type: ignore[no-untyped-def]
        atol = np.concatenate([np.full(n, rtol * 100.0), np.full(4 * n, rtol)])
        return solve_ivp(
            slope, (0.0, DURATION), y0, method="BDF", t_eval=STORED, rtol=rtol, atol=atol,
            jac_sparsity=pattern,
        )  # fmt: skip

    fine = peer(1e-6).y[:n].T
    for rtol in (1e-3, 1e-4, 1e-5):
        seconds, out = _timed(lambda r=rtol: peer(r), repeat=1)
        # A peer is compared with its own fine run: the seed of its rates differs from ours.
        rows.append((f"solve_ivp BDF, rtol {rtol:g}", seconds, np.abs(out.y[:n].T - fine).max()))
    _table(capsys, "round, 200 cells, 4 h, 42CrMo4 transforming", rows)
    with capsys.disabled():
        print(f"  the two fine runs differ by {np.abs(fine - truth).max():.2f} K at most")
    assert rows[1][2] < 0.3
