"""A textbook solution, problem 12-7, with the constant 11.9 (its overturning speed is a slip: left out)."""

from __future__ import annotations

from published import equilibrium, one


def test_equilibrium_cant() -> None:
    one("US-TB-119").check(equilibrium_cant_mm=equilibrium(one("US-TB-119")))
