"""The generated function reference is current, and its worked conversion is right."""

from __future__ import annotations

import pytest

from xleq.hosts.headless import evaluate_formula
from xleq.hosts.reference import PAGE, whole_reference


def test_the_reference_is_current() -> None:
    assert PAGE.read_text("utf-8") == whole_reference(), "run: python -m xleq.hosts.reference"


def test_the_worked_conversion_gives_the_numbers_of_the_text() -> None:
    # Brown and LeMay, Chemistry: The Central Science, sample exercise: Kp = 4.34e-3 in atm.
    kp = evaluate_formula('=XLEQ_KP(9.6, "N2 + 3 H2 = 2 NH3", 573, "atm")')
    k = evaluate_formula('=XLEQ_K_CONVERT(9.6, "N2 + 3 H2 = 2 NH3", "Kc[mol/L]", "K", 573)')
    assert kp == pytest.approx(0.004342, abs=5e-7)
    assert k == pytest.approx(0.004230, abs=5e-7)
