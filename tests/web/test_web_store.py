"""Plans in the database: owners, decisions, expiry, and tables that are what the migrations make."""

from __future__ import annotations

from collections.abc import Iterator
from datetime import UTC, datetime, timedelta
from pathlib import Path

import pytest
from alembic.autogenerate import compare_metadata
from alembic.migration import MigrationContext
from sqlalchemy import select, update

from cant import limit_sets
from cant.errors import FileError, InputError
from webapp.decisions import as_text, limits_text
from webapp.keeping.access import NotThereError
from webapp.keeping.database import Database
from webapp.keeping.kept_limits import KeptLimitsStore
from webapp.keeping.records import Base, DecisionRow, FileRow, KeptLimitsRow, PlanRow
from webapp.keeping.store import Store


@pytest.fixture
def database(database_url: str) -> Iterator[Database]:
    opened = Database(database_url.replace("postgresql:", "postgresql+psycopg:"))
    yield opened
    opened.close()


@pytest.fixture
def store(database: Database) -> Store:
    return Store(database, keep_days=30)


@pytest.fixture
def shelf(database: Database) -> KeptLimitsStore:
    return KeptLimitsStore(database, keep_days=30)


def test_migrations_make_the_tables_of_the_records(database: Database) -> None:
    with database.engine.connect() as connection:
        context = MigrationContext.configure(connection, opts={"compare_type": True})
        assert compare_metadata(context, Base.metadata) == []


def test_migrating_again_changes_nothing(database: Database, store: Store, database_url: str) -> None:
    plan = store.add("anna", "line.csv", b"content")
    again = Database(database_url.replace("postgresql:", "postgresql+psycopg:"))
    assert Store(again, 30).plan("anna", plan.address).file_name == "line.csv"
    again.close()


def test_plan_belongs_to_its_owner_alone(store: Store) -> None:
    plan = store.add("anna", "line.csv", b"content")
    assert store.file("anna", plan.address) == b"content"
    for act in (
        lambda: store.plan("bert", plan.address),
        lambda: store.file("bert", plan.address),
        lambda: store.decide("bert", plan.address, {"confirmed": "true"}),
        lambda: store.rename("bert", plan.address, "mine"),
        lambda: store.keep_longer("bert", plan.address),
        lambda: store.remove("bert", plan.address),
    ):
        with pytest.raises(NotThereError):
            act()
    assert store.plans("bert") == []
    assert store.plan("anna", plan.address).decided.confirmed is False


def test_address_has_at_least_128_random_bits(store: Store) -> None:
    addresses = {store.add("anna", "line.csv", b"x").address for _ in range(20)}
    assert len(addresses) == 20
    assert all(len(address) * 6 >= 128 for address in addresses)


def test_last_decision_of_a_kind_rules_and_the_history_stays(store: Store) -> None:
    typical = limit_sets.load("typical")
    plan = store.add("anna", "line.csv", b"x")
    store.decide("anna", plan.address, {"limits": limits_text(typical)}, reason="as agreed")
    plan = store.decide("anna", plan.address, {"limits": "null", "confirmed": as_text(True)})
    assert plan.decided.limits is None
    assert plan.decided.confirmed
    assert [(d.kind, d.reason) for d in plan.history] == [
        ("limits", "as agreed"),
        ("limits", ""),
        ("confirmed", ""),
    ]
    same = store.decide("anna", plan.address, {"confirmed": as_text(True)})
    assert len(same.history) == 3
    assert store.plan("anna", plan.address) == same


def test_unknown_kind_of_decision_is_refused_whole(store: Store) -> None:
    plan = store.add("anna", "line.csv", b"x")
    with pytest.raises(InputError, match="unknown kind"):
        store.decide("anna", plan.address, {"confirmed": "true", "colour": '"red"'})
    assert store.plan("anna", plan.address).history == ()


def test_every_limit_set_survives_being_stored(store: Store) -> None:
    for name in limit_sets.names():
        limits = limit_sets.load(name)
        plan = store.add("anna", "line.csv", b"x", {"limits": limits_text(limits)})
        back = store.plan("anna", plan.address).decided.limits
        assert back is not None
        assert back.model_dump() == limits.model_dump()


def test_expired_plans_are_gone_and_then_deleted(
    database: Database, store: Store, shelf: KeptLimitsStore
) -> None:
    old, young = (store.add("anna", name, b"x") for name in ("old.csv", "young.csv"))
    shelf.keep("anna", "mine", limit_sets.load("typical"))
    past = datetime.now(UTC) - timedelta(seconds=1)
    with database.sessions.begin() as session:
        session.execute(update(PlanRow).where(PlanRow.address == old.address).values(expires=past))
        session.execute(update(KeptLimitsRow).values(expires=past))
    with pytest.raises(NotThereError):
        store.plan("anna", old.address)
    assert [plan.address for plan in store.plans("anna")] == [young.address]
    assert shelf.of("anna") == []
    assert store.remove_expired() == 1
    with database.sessions() as session:
        assert len(session.scalars(select(PlanRow)).all()) == 1
        assert len(session.scalars(select(FileRow)).all()) == 1
        assert session.scalars(select(DecisionRow)).all() == []
        assert session.scalars(select(KeptLimitsRow)).all() == []


def test_every_change_starts_the_days_anew(database: Database, store: Store) -> None:
    plan = store.add("anna", "line.csv", b"x")
    soon = datetime.now(UTC) + timedelta(days=1)
    with database.sessions.begin() as session:
        session.execute(update(PlanRow).values(expires=soon))
    kept = store.keep_longer("anna", plan.address)
    assert kept.expires - datetime.now(UTC) > timedelta(days=29)


def test_kept_limits_are_the_owners_and_replaced_by_name(shelf: KeptLimitsStore) -> None:
    typical = limit_sets.load("typical")
    edited = typical.model_copy(update={"edited": True})
    shelf.keep("anna", "mine", typical)
    shelf.keep("anna", "mine", edited)
    kept = shelf.of("anna")
    assert [(k.name, k.limits.model_dump()) for k in kept] == [("mine", edited.model_dump())]
    assert shelf.of("bert") == []
    shelf.forget("bert", "mine")
    assert shelf.of("anna")
    shelf.forget("anna", "mine")
    assert shelf.of("anna") == []
    with pytest.raises(InputError, match="printable"):
        shelf.keep("anna", "a\x00b", typical)


def test_unusable_database_is_told_in_one_line(tmp_path: Path) -> None:
    (tmp_path / "plans.sqlite3").write_bytes(b"this is no database, and long enough to be looked at" * 50)
    with pytest.raises(FileError, match="cannot be used"):
        Database(f"sqlite:///{tmp_path / 'plans.sqlite3'}")
    with pytest.raises(InputError, match="SQLite"):
        Database("mysql://somewhere/else")


def test_missing_driver_is_told_in_one_line(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("webapp.keeping.database.create_engine", missing)
    with pytest.raises(InputError, match=r"driver nodriver.*\[postgresql\]"):
        Database("postgresql+psycopg://somewhere/plans")


def missing(*_args: object, **_options: object) -> None:
    raise ModuleNotFoundError(name="nodriver")
