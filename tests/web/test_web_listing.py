"""The list of a plan: filter, search, sort and page over arrays, the same as over its records."""

from __future__ import annotations

from pathlib import Path

import pytest

from cant import service
from cant.model.plan import STATUSES
from webapp.computing import Latest
from webapp.listing import Listing, Wanted


@pytest.fixture(scope="module")
def listing(sample_file: Path) -> Listing:
    reading = service.read_curves(sample_file.read_bytes(), sample_file.name)
    return Listing(service.make_plan(reading))


def records(listing: Listing, wanted: Wanted) -> list[dict[str, object]]:
    return [listing.planned.record(int(i)) for i in listing.select(wanted)]


def test_counts_are_those_of_the_records(listing: Listing) -> None:
    all_of_them = records(listing, Wanted())
    for status, count in listing.counts().items():
        assert count == sum(r["status"] == status for r in all_of_them)
        assert len(listing.select(Wanted(statuses=frozenset([status])))) == count
    assert sum(listing.counts().values()) == len(all_of_them)
    assert list(listing.counts()) == list(STATUSES)


@pytest.mark.parametrize(
    ("sort", "key"),
    [("radius", "radius_m"), ("today", "existing_cant_mm"), ("proposed", "recommended_cant_mm")],
)
def test_sorted_rises_and_what_is_not_known_comes_last(listing: Listing, sort: str, key: str) -> None:
    values = [r[key] for r in records(listing, Wanted(sort=sort))]
    known = [v for v in values if v is not None]
    assert known == sorted(known)
    assert values[: len(known)] == known


def test_falling_is_rising_turned(listing: Listing) -> None:
    rising = [r["curve"] for r in records(listing, Wanted(sort="name"))]
    assert [r["curve"] for r in records(listing, Wanted(sort="name", falling=True))] == rising[::-1]


def test_list_order_is_input_order(listing: Listing) -> None:
    rows = [r["row"] for r in records(listing, Wanted())]
    assert rows == sorted(rows)


def test_search_needs_every_word_in_names_or_situation(listing: Listing) -> None:
    found = records(listing, Wanted(search="PLATFORM"))
    assert found
    assert all("platform" in str(r["as_read"]["situation"]) for r in found)
    assert records(listing, Wanted(search="platform nowhere")) == []


def test_track_filter_and_neighbours_follow_the_chainage(listing: Listing) -> None:
    for track in listing.tracks:
        on_it = records(listing, Wanted(track=track, sort="chainage"))
        assert {f"{r['line']} / {r['track']}" for r in on_it} == {track}
        order = [int(i) for i in listing.along[track]]
        for before, here, after in zip([None, *order], order, [*order[1:], None], strict=False):
            assert listing.neighbours(here) == (before, after)


def test_pages_hold_everything_once(listing: Listing) -> None:
    wanted = Wanted(size=25)
    first = listing.page(wanted)
    seen = [i for n in range(1, first.pages + 1) for i in listing.page(Wanted(size=25, page=n)).indices]
    assert seen == [int(i) for i in listing.select(wanted)]
    assert listing.page(Wanted(size=25, page=999)).number == first.pages


def test_query_is_read_back(listing: Listing) -> None:
    wanted = Wanted(frozenset(["change"]), "a b", "x / 1", "radius", True, 3, 100)
    pairs = [pair.split("=") for pair in wanted.query(page=3)[1:].split("&")]
    assert ["page", "3"] in pairs
    assert Wanted.of({"page": "-1", "size": "7", "sort": "colour", "order": "up"}, ["red"]) == Wanted()


def test_latest_makes_each_value_once_and_forgets_the_oldest() -> None:
    made: list[str] = []
    latest: Latest[str] = Latest(2)
    for key in ("a", "b", "a", "c", "a", "b"):
        assert latest.get(key, lambda key=key: made.append(key) or key) == key
    assert made == ["a", "b", "c", "b"]


def test_latest_keeps_nothing_of_a_failure() -> None:
    latest: Latest[int] = Latest(2)

    def fails() -> int:
        message = "no"
        raise ValueError(message)

    with pytest.raises(ValueError, match="no"):
        latest.get("a", fails)
    assert latest.get("a", lambda: 1) == 1
