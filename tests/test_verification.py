"""The verification table: its script still finds what the written table says, for a case of each kind."""

import sys
from pathlib import Path

import pytest
from cases import reference_cases

ROOT = Path(__file__).parent.parent
sys.path.insert(0, str(ROOT / "benchmarks"))
import verification  # noqa: E402

TABLE = ROOT / "benchmarks" / "results" / "verification.md"
QUICK = {"rel_tol": 1e-5, "order": 3, "peak_tol": 1e-3}
#: Exact, series and numeric; solid, hollow, open; with and without a finite peak.
SOME = ("circle_r25", "equilateral_a60", "rect_3", "ecctube_50_30_15", "sharp_L3", "angle_80_8_r8", "twocell_fillet")


def written():
    rows = [line.strip("| \n").split(" | ") for line in TABLE.read_text(encoding="utf-8").splitlines() if "|" in line]
    return rows[0], rows[2:]


def test_every_reference_case_is_in_the_table():
    head, rows = written()
    assert head[:2] == ["case", "quantity"]
    assert {row[0] for row in rows} >= set(reference_cases())
    assert sum(row[2] == "AISC Shapes Database" for row in rows) == 25
    inside = [row[-1] for row in rows if row[1] == "torsion constant"]
    assert "NO" not in inside
    assert inside.count("yes") > 90


@pytest.mark.parametrize("name", SOME)
def test_checks_hold_and_agree_with_the_table(name):
    _, rows = written()
    known = {row[1]: row for row in rows if row[0] == name and row[3] and "published" not in row[2]}
    checks = list(verification.checks_of(reference_cases()[name], **QUICK))
    assert {check.quantity for check in checks} >= {"J", "shear_centre", "T_p_over_k"}
    for check in checks:
        assert check.holds, check
        if check.quantity in ("J", "W_t", "T_p_over_k"):
            row = known[verification.WORDS[check.quantity]]
            assert check.ours == pytest.approx(float(row[4]), rel=2e-3 if check.quantity == "W_t" else 2e-5)


def test_a_wrong_value_does_not_hold():
    good = next(verification.checks_of(reference_cases()["circle_r25"], **QUICK))
    bad = verification.Check(**{**vars(good), "deviation": 1e-3})
    assert good.holds
    assert not bad.holds
    assert not verification.Check(**{**vars(good), "enclosed": False}).holds
