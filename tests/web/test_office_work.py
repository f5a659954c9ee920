"""The queue of long work: claimed once, in fair turn, cancelled, lost and found; results that are ours."""

from __future__ import annotations

import threading
from collections.abc import Iterator
from dataclasses import replace
from datetime import UTC, datetime, timedelta

import pytest
from sqlalchemy import select, update

from webapp.basis import Basis
from webapp.busy import BusyError
from webapp.computing import Latest
from webapp.decisions import Decided
from webapp.keeping.access import NotAllowedError, NotThereError
from webapp.keeping.database import Database
from webapp.keeping.records import GrantRow, PlanRow, ResultRow, WorkRow
from webapp.keeping.results import KEPT, Results
from webapp.keeping.store import Store
from webapp.keeping.work import CANCELLED, DONE, FAILED, MOST_ENDED, UNDER_WAY, WAITING, Piece, WorkQueue
from webapp.keeping.work_claims import MOST_ATTEMPTS, MOST_LOSSES, Claims
from webapp.working import orders
from webapp.working.orders import KINDS, QUICK, Order
from webapp.working.sealing import Seal, pack, unpack


@pytest.fixture
def database(database_url: str) -> Iterator[Database]:
    opened = Database(database_url.replace("postgresql:", "postgresql+psycopg:"))
    yield opened
    opened.close()


@pytest.fixture
def store(database: Database) -> Store:
    return Store(database, keep_days=30)


@pytest.fixture
def queue(database: Database) -> WorkQueue:
    return WorkQueue(database, per_person=20, in_all=30)


@pytest.fixture
def claims(database: Database) -> Claims:
    return Claims(database)


def ask(queue: WorkQueue, store: Store, who: str, key: str, kind: str = "plan") -> tuple[str, Piece]:
    """Let somebody ask for work on a new plan; give the plan's address and the piece."""
    plan = store.add(who, "line.csv", b"content")
    return plan.address, queue.ask(who, plan.address, kind, key, "{}")


def state_of(database: Database, piece: Piece) -> WorkRow:
    with database.sessions() as session:
        return session.scalars(select(WorkRow).where(WorkRow.id == piece.id)).one()


def be_silent(database: Database, piece: Piece, seconds: float = 20) -> None:
    """Let the worker of a piece have said nothing for some time."""
    with database.sessions.begin() as session:
        beat = datetime.now(UTC) - timedelta(seconds=seconds)
        session.execute(update(WorkRow).where(WorkRow.id == piece.id).values(beat=beat))


def test_each_piece_is_claimed_once_by_two_workers(
    database: Database, database_url: str, queue: WorkQueue, store: Store
) -> None:
    pieces = {ask(queue, store, f"owner {i % 3}", f"k{i}")[1].id for i in range(24)}
    taken: list[int] = []

    def work() -> None:
        mine = Database(database_url.replace("postgresql:", "postgresql+psycopg:"))
        while (piece := Claims(mine).take(KINDS)) is not None:
            taken.append(piece.id)
        mine.close()

    workers = [threading.Thread(target=work) for _ in range(2)]
    for worker in workers:
        worker.start()
    for worker in workers:
        worker.join()
    # A worker that lost every race may have stopped early; nothing is left for a third one then either.
    while (piece := Claims(database).take(KINDS)) is not None:
        taken.append(piece.id)
    assert len(taken) == len(set(taken))
    assert set(taken) == pieces


def test_one_who_asks_for_much_does_not_keep_others_waiting(
    queue: WorkQueue, claims: Claims, store: Store
) -> None:
    first = [ask(queue, store, "anna", f"a{i}")[1] for i in range(5)]
    _, late = ask(queue, store, "bert", "b")
    assert [queue.before(piece) for piece in (*first, late)] == [0, 1, 2, 3, 4, 5]
    one = claims.take(KINDS)
    assert one is not None
    assert one.id == first[0].id
    assert queue.before(late) == 0
    two = claims.take(KINDS)
    assert two is not None
    assert two.id == late.id
    # Both are done; anna was served first, bert has asked for more: whose turn is it? The oldest waits.
    assert claims.finish(one, b"1")
    assert claims.finish(two, b"2")
    _, more = ask(queue, store, "bert", "b2")
    three = claims.take(KINDS)
    assert three is not None
    assert three.id == first[1].id
    four = claims.take(KINDS)
    assert four is not None
    assert four.id == more.id


def test_what_is_soon_done_does_not_wait_behind_workbooks(
    queue: WorkQueue, claims: Claims, store: Store
) -> None:
    ask(queue, store, "anna", "book", "workbook")
    _, quick = ask(queue, store, "bert", "plan")
    found = claims.take(QUICK)
    assert found is not None
    assert found.id == quick.id
    assert claims.take(QUICK) is None


def test_the_same_is_asked_for_once(queue: WorkQueue, store: Store, database: Database) -> None:
    plan = store.add("anna", "line.csv", b"content")
    pieces = {queue.ask("anna", plan.address, "plan", "same", "{}").id for _ in range(3)}
    assert len(pieces) == 1
    with pytest.raises(NotThereError):
        queue.ask("bert", plan.address, "plan", "same", "{}")
    found: list[Piece] = []
    threads = [
        threading.Thread(target=lambda: found.append(queue.ask("anna", plan.address, "plan", "raced", "{}")))
        for _ in range(6)
    ]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert len(found) == 6
    assert len({piece.id for piece in found}) == 1


def test_no_more_waits_than_may(database: Database, store: Store) -> None:
    queue = WorkQueue(database, per_person=2, in_all=3)
    ask(queue, store, "anna", "1")
    ask(queue, store, "anna", "2")
    with pytest.raises(BusyError, match="waiting") as caught:
        ask(queue, store, "anna", "3")
    assert caught.value.retry_s > 0
    ask(queue, store, "bert", "4")
    with pytest.raises(BusyError):
        ask(queue, store, "cora", "5")
    assert Claims(database).take(KINDS) is not None
    ask(queue, store, "cora", "6")


def test_no_more_waits_than_may_where_many_ask_at_once(database: Database, store: Store) -> None:
    queue = WorkQueue(database, per_person=3, in_all=30)
    plan = store.add("anna", "line.csv", b"content")
    together = threading.Barrier(12)
    refused: list[BusyError] = []

    def ask_for(key: str) -> None:
        together.wait()
        try:
            queue.ask("anna", plan.address, "plan", key, "{}")
        except BusyError as error:
            refused.append(error)

    threads = [threading.Thread(target=ask_for, args=(f"k{i}",)) for i in range(12)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert len(queue.of_plan("anna", plan.address)) == 3
    assert len(refused) == 9


def test_work_asked_for_and_cancelled_without_end_is_not_kept(
    queue: WorkQueue, store: Store, database: Database
) -> None:
    address, open_one = ask(queue, store, "anna", "first")
    for number in range(MOST_ENDED + 5):
        last = queue.ask("anna", address, "plan", f"k{number}", "{}")
        queue.cancel("anna", address, last.address)
    known = queue.of_plan("anna", address)
    assert len(known) == MOST_ENDED + 1
    assert {open_one.id, last.id} <= {piece.id for piece in known}


def test_cancelled_work_is_not_begun_and_stores_nothing(
    queue: WorkQueue, claims: Claims, store: Store, database: Database
) -> None:
    address, waiting = ask(queue, store, "anna", "1")
    assert queue.cancel("anna", address, waiting.address).state == CANCELLED
    assert claims.take(KINDS) is None
    assert queue.again("anna", address, waiting.address).state == WAITING
    begun = claims.take(KINDS)
    assert begun is not None
    assert claims.tell(begun, 0.5, "half")
    assert queue.cancel("anna", address, begun.address).state == CANCELLED
    assert not claims.tell(begun, 0.6, "on")
    assert not claims.finish(begun, b"result")
    assert not claims.end(begun, FAILED, "x")
    assert Results(database).of("anna", address, "1") is None
    assert state_of(database, begun).state == CANCELLED


def test_who_reads_alone_cancels_only_what_he_asked_for(
    queue: WorkQueue, store: Store, database: Database
) -> None:
    address, piece = ask(queue, store, "anna", "1")
    with pytest.raises(NotThereError):
        queue.cancel("reader", address, piece.address)
    with database.sessions.begin() as session:
        plan = session.scalars(select(PlanRow).where(PlanRow.address == address)).one()
        session.add(GrantRow(plan_id=plan.id, holder="reader", may_edit=False, made=datetime.now(UTC)))
    with pytest.raises(NotAllowedError):
        queue.cancel("reader", address, piece.address)
    own = queue.ask("reader", address, "workbook", "2", "{}")
    assert queue.cancel("reader", address, own.address).state == CANCELLED
    assert queue.cancel("anna", address, piece.address).state == CANCELLED


def test_a_piece_whose_worker_died_is_taken_up_again(
    queue: WorkQueue, claims: Claims, store: Store, database: Database
) -> None:
    address, _ = ask(queue, store, "anna", "1")
    dead = claims.take(KINDS)
    assert dead is not None
    claims.find_lost()
    assert claims.take(KINDS) is None, "its worker has just been heard of"
    be_silent(database, dead)
    claims.find_lost()
    heir = claims.take(KINDS)
    assert heir is not None
    assert (heir.id, heir.attempts) == (dead.id, 2)
    assert not claims.finish(dead, b"from the dead")
    assert claims.finish(heir, b"result")
    assert Results(database).of("anna", address, "1") == b"result"


def test_work_that_kills_its_workers_is_given_up(
    queue: WorkQueue, claims: Claims, store: Store, database: Database
) -> None:
    address, _ = ask(queue, store, "anna", "1")
    for attempt in range(1, MOST_ATTEMPTS + 1):
        piece = claims.take(KINDS)
        assert piece is not None
        assert piece.attempts == attempt
        if attempt % 2:
            claims.give_back(piece, counts=True)
        else:
            be_silent(database, piece)
            claims.find_lost()
    assert claims.take(KINDS) is None
    known = queue.of_plan("anna", address)[0]
    assert known.state == FAILED
    assert "several times" in known.message
    assert queue.again("anna", address, known.address).attempts == 0
    piece = claims.take(KINDS)
    assert piece is not None
    claims.give_back(piece, counts=False)
    assert queue.of_plan("anna", address)[0].attempts == 0, "an orderly stop is no attempt"


def test_work_lost_with_its_worker_is_taken_up_more_often_before_it_is_given_up(
    queue: WorkQueue, claims: Claims, store: Store, database: Database
) -> None:
    address, _ = ask(queue, store, "anna", "1")
    for _ in range(MOST_LOSSES):
        piece = claims.take(KINDS)
        assert piece is not None
        be_silent(database, piece)
        claims.find_lost()
    assert claims.take(KINDS) is None
    assert queue.of_plan("anna", address)[0].state == FAILED


def test_a_plan_deleted_during_its_work_leaves_nothing(
    queue: WorkQueue, claims: Claims, store: Store, database: Database
) -> None:
    address, _ = ask(queue, store, "anna", "1")
    piece = claims.take(KINDS)
    assert piece is not None
    store.remove("anna", address)
    assert not claims.tell(piece, 0.5, "on")
    assert not claims.finish(piece, b"result")
    Results(database).keep(piece.plan_id, "reading", "part", b"part")
    assert claims.file(piece) is None
    with database.sessions() as session:
        assert session.scalars(select(WorkRow)).all() == []
        assert session.scalars(select(ResultRow)).all() == []


def test_what_is_done_and_gone_is_made_again(
    queue: WorkQueue, claims: Claims, store: Store, database: Database
) -> None:
    plan = store.add("anna", "line.csv", b"content")
    queue.ask("anna", plan.address, "plan", "1", "{}")
    piece = claims.take(KINDS)
    assert piece is not None
    assert claims.finish(piece, b"result")
    assert state_of(database, piece).state == DONE
    Results(database).forget("1")
    assert queue.ask("anna", plan.address, "plan", "1", "{}").state == WAITING


def test_results_are_kept_as_long_as_they_are_of_use(
    queue: WorkQueue, claims: Claims, store: Store, database: Database
) -> None:
    plan = store.add("anna", "line.csv", b"content")
    results = Results(database)
    for number in range(KEPT["workbook"] + 2):
        queue.ask("anna", plan.address, "workbook", f"w{number}", "{}")
        piece = claims.take(KINDS)
        assert piece is not None
        assert claims.finish(piece, str(number).encode())
    known = [results.of("anna", plan.address, f"w{number}") for number in range(KEPT["workbook"] + 2)]
    assert known == [None, None, *(str(n).encode() for n in range(2, KEPT["workbook"] + 2))]
    with database.sessions.begin() as session:
        long_ago = datetime.now(UTC) - timedelta(days=3)
        session.execute(update(ResultRow).where(ResultRow.key == "w3").values(used=long_ago))
        session.execute(update(WorkRow).where(WorkRow.key == "w0").values(ended=long_ago))
    results.tidy()
    claims.tidy()
    assert results.of("anna", plan.address, "w3") is None
    assert results.of("anna", plan.address, "w2") == b"2"
    assert "w0" not in {piece.key for piece in queue.of_plan("anna", plan.address)}


def test_it_is_told_where_nobody_works(queue: WorkQueue, store: Store, database: Database) -> None:
    address, piece = ask(queue, store, "anna", "1")
    assert not queue.nobody_works(piece)
    old = replace(piece, made=datetime.now(UTC) - timedelta(minutes=5))
    assert queue.nobody_works(old)
    _, other = ask(queue, store, "bert", "2")
    with database.sessions.begin() as session:
        at_work = {"state": UNDER_WAY, "beat": datetime.now(UTC)}
        session.execute(update(WorkRow).where(WorkRow.id == other.id).values(**at_work))
    assert not queue.nobody_works(old)
    assert queue.open_of([address])[address] == [piece]


def order(texts: dict[str, str], kind: str = "plan", more: tuple[tuple[str, str], ...] = ()) -> Order:
    return Order(kind, Basis("line.csv", "d" * 64, Decided.of_texts(texts)), more)


def test_a_result_has_the_key_of_all_that_it_follows_from(monkeypatch: pytest.MonkeyPatch) -> None:
    settings = {"settings": '{"keep_within_mm": 10.0}'}
    keys = {
        order({}).key,
        order(settings).key,
        order({}, "reading").key,
        order({}, "workbook").key,
        order({}, "workbook", (("system", "us"),)).key,
        Order("plan", replace(order({}).basis, file_digest="e" * 64)).key,
        Order("plan", replace(order({}).basis, file_name="other.csv")).key,
    }
    assert len(keys) == 7
    assert order({}).key == order({"confirmed": "true"}).key, "what does not matter is left out"
    assert order(settings, "reading").key == order({}, "reading").key
    again = Order.of("workbook", order(settings, "workbook", (("system", "us"),)).content)
    assert again == order({**again.basis.decided.texts}, "workbook", (("system", "us"),))
    assert again.needs("plan").key == order(settings).key
    before = order({}).key
    monkeypatch.setattr(orders, "program", lambda: "another version")
    assert order({}).key != before


def test_what_was_not_sealed_here_is_not_opened() -> None:
    seal = Seal("a key of this service")
    sealed = seal.close("plan-1", pack([1, 2]))
    opened = seal.open("plan-1", sealed)
    assert opened is not None
    assert unpack(opened) == [1, 2]
    assert seal.open("plan-2", sealed) is None, "of another plan or version"
    assert Seal("another key").open("plan-1", sealed) is None
    assert seal.open("plan-1", sealed[:-1] + bytes([sealed[-1] ^ 1])) is None
    assert seal.open("plan-1", pack([1, 2])) is None
    assert seal.open("plan-1", b"") is None


def test_memory_is_bounded_by_weight_and_keeps_the_latest() -> None:
    latest: Latest[str] = Latest(10, len, 10)
    for key in ("aaaa", "bbbb", "cc"):
        latest.put(key, key)
    made: list[str] = []

    def get(key: str) -> None:
        latest.get(key, lambda: made.append(key) or key)  # type: ignore[func-returns-value]

    for key in ("aaaa", "bbbb", "cc"):
        get(key)
    assert made == []
    get("ddd")
    assert made == ["ddd"]
    get("bbbb")
    get("cc")
    assert made == ["ddd"], "the oldest alone had to go"
    get("e" * 30)
    get("e" * 30)
    assert made == ["ddd", "e" * 30], "one that is too heavy is kept while it is the latest"
