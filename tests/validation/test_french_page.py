"""A French encyclopaedia page on cant deficiency: 11.8 V^2 / R (common practice)."""

from __future__ import annotations

from published import equilibrium, one


def test_equilibrium_cant() -> None:
    one("FR-118").check(equilibrium_cant_mm=equilibrium(one("FR-118")))
