"""A closed night in words, for a terminal."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any

from app.schemas.types import format_instant

COVERAGE = 1.959963984540054  # standard uncertainties of a 95 % interval of the normal law
RELEASE = "If a release is possible, the site's emergency procedure comes first."


def night(body: Mapping[str, Any]) -> Iterator[str]:
    """A reconciliation in a few lines: what is flagged, what is missing, what could have been seen."""
    opening, closing = format_instant(body["opening"]), format_instant(body["closing"])
    yield f"{body['site']} {body['id']}: {body['status']}, from {opening} to {closing}"
    flagged = [one for one in body["vessels"] if one["flagged"]]
    if any(one["imbalance_kg"] < 0 for one in flagged):
        yield f"  {RELEASE}"
    for one in flagged:
        yield f"  {flag(one)}"
    missing = [
        one["vessel"] for one in body["vessels"] if one["imbalance_kg"] is None and one["status"] != "out_of_service"
    ]
    if missing:
        yield f"  incomplete: no balance for {', '.join(missing)}"


def flag(one: Mapping[str, Any]) -> str:
    """One flagged vessel: what is missing or too much, its interval, and what chance explains."""
    imbalance, u = one["imbalance_kg"], one["imbalance_uncertainty_kg"]
    word = "short of book" if imbalance < 0 else "over book"
    names = " with ".join([one["vessel"], *one["judged_with"]])
    return (
        f"{names}: {abs(imbalance):,.0f} kg {word} ± {COVERAGE * u:,.0f} kg (95 %), "
        f"{abs(one['score']):.1f} times its standard uncertainty"
    )


def table(body: Mapping[str, Any]) -> Iterator[str]:
    """Every vessel of a night, one line each."""
    yield f"  {'vessel':<16}{'closing kg':>15}{'imbalance kg':>15}{'u kg':>10}{'visible kg':>13}  verdict"
    for one in body["vessels"]:
        numbers = (
            one["closing_mass_kg"],
            one["imbalance_kg"],
            one["imbalance_uncertainty_kg"],
            one["detectable_imbalance_kg"],
        )
        cells = ["–" if number is None else f"{number:,.0f}" for number in numbers]
        verdict = one.get("verdict") or one["status"]
        yield f"  {one['vessel']:<16}{cells[0]:>15}{cells[1]:>15}{cells[2]:>10}{cells[3]:>13}  {verdict}"
