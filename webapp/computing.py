"""Readings and plans computed from what is stored, each once: the latest stay in memory.

A page asks for a plan; it is computed when nobody has asked before, and found afterwards. The key is the
digest of the file and of the decisions that matter, so that a changed decision can never show an old plan.
What takes long is asked for elsewhere (:class:`Elsewhere`), and who asks is told to come back.
"""

from __future__ import annotations

import threading
from collections import OrderedDict
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, replace
from typing import Any, Generic, Protocol, TypeVar

from cant import service
from cant.explaining import explain
from cant.model.reading import Reading
from cant.model.signatures import Signatures
from cant.planning import Plan
from cant.service import AnnotatedFile, PlannedLine
from webapp.basis import PLAN_KINDS, READING_KINDS, Basis
from webapp.keeping.store import StoredPlan
from webapp.listing import Listing
from webapp.measures import SYSTEMS

Kept = TypeVar("Kept")
Bytes = Callable[[], bytes]
CURVES_MOVED = 16
"""Curves of a plan whose records at every cant of the slider are kept."""


class Latest(Generic[Kept]):
    """The latest values by key; one that is missing is made once, however many ask for it.

    Parameters
    ----------
    size : int
        Values kept.
    weigh : callable, optional
        Gives the weight of a value.
    most : int
        Weight of all values kept together; the latest one is kept whatever it weighs.
    """

    def __init__(self, size: int, weigh: Callable[[Kept], int] = lambda _: 0, most: int = 0) -> None:
        self._size = size
        self._weigh, self._most, self._weight = weigh, most, 0
        self._kept: OrderedDict[str, Kept] = OrderedDict()
        self._making: dict[str, threading.Lock] = {}
        self._lock = threading.Lock()

    def put(self, key: str, value: Kept) -> None:
        """Keep a value that is known already."""
        with self._lock:
            before = self._kept.pop(key, None)
            self._weight += self._weigh(value) - (0 if before is None else self._weigh(before))
            self._kept[key] = value
            while len(self._kept) > 1 and (len(self._kept) > self._size or self._weight > self._most):
                self._weight -= self._weigh(self._kept.popitem(last=False)[1])

    def get(self, key: str, make: Callable[[], Kept]) -> Kept:
        """Give the value of a key, made by ``make`` where it is not kept; its errors pass through."""
        with self._lock:
            if key in self._kept:
                self._kept.move_to_end(key)
                return self._kept[key]
            making = self._making.setdefault(key, threading.Lock())
        with making:
            with self._lock:
                if key in self._kept:
                    return self._kept[key]
            try:
                value = make()
                self.put(key, value)
            finally:
                with self._lock:
                    self._making.pop(key, None)
        return value


@dataclass(frozen=True)
class Slider:
    """A curve as planned, and at every cant of its slider with the neighbours as they are.

    Attributes
    ----------
    record : dict
        As planned.
    at : dict of float to dict
        Record by cant [mm], ascending.
    """

    record: dict[str, Any]
    at: dict[float, dict[str, Any]]

    @property
    def levels(self) -> list[float]:
        """The cants [mm]."""
        return list(self.at)


class Computed:
    """A plan as computed, its list, and its words in either system of units.

    Parameters
    ----------
    planned : PlannedLine
        In the units of its own settings.
    """

    def __init__(self, planned: PlannedLine) -> None:
        self.planned = planned
        self.listing = Listing(planned)
        self.speaking = threading.RLock()
        """Held while words are made: they are made when asked for, and kept, by one at a time."""
        self._shown: Latest[PlannedLine] = Latest(len(SYSTEMS))
        self._sliders: Latest[Slider] = Latest(CURVES_MOVED)

    def shown_in(self, system: str) -> PlannedLine:
        """Give the same plan with its words in a system of units; its numbers are the same objects."""
        plan = self.planned.plan
        if system == plan.settings.units:
            return self.planned
        return self._shown.get(system, lambda: self._worded(system))

    def _worded(self, system: str) -> PlannedLine:
        plan = self.planned.plan
        settings = plan.settings.model_copy(update={"units": system})
        worded = Plan(replace(plan.outcome, settings=settings))
        return PlannedLine(self.planned.reading, worded, explain(worded))

    def records(self, indices: Sequence[int], system: str) -> list[tuple[int, dict[str, Any]]]:
        """Give the records of some curves, with their indices and with words in a system of units."""
        if not indices:
            return []
        with self.speaking:
            return list(zip(indices, self.shown_in(system).records_of(indices), strict=True))

    def rows(self, indices: Sequence[int], system: str) -> list[tuple[int, dict[str, Any]]]:
        """Give what a table shows of some curves: figures and reason, without findings, options and methods.

        The methods are compared over the whole line, which a long table need not wait for.
        """
        if not indices:
            return []
        planned = self.shown_in(system)
        with self.speaking:
            records = list(planned.plan.records(indices))
            reasons = planned.explanation.reasons(indices, records)
        for record, reason in zip(records, reasons, strict=True):
            record["reason"] = reason
        return list(zip(indices, records, strict=True))

    def record(self, index: int, system: str) -> dict[str, Any]:
        """Give the record of one curve with words in a system of units."""
        return self.records([index], system)[0][1]

    def slider(self, index: int, make: Callable[[], Slider]) -> Slider:
        """Give what a curve is at every cant of its slider: made at the first question, and kept."""
        return self._sliders.get(str(index), make)

    def json_chunks(self) -> Iterator[bytes]:
        """Give the JSON of the plan in pieces; between two of them others may ask for records."""
        chunks = self.planned.json_chunks()
        while True:
            with self.speaking:
                chunk = next(chunks, None)
            if chunk is None:
                return
            yield chunk

    def workbook(
        self, data: bytes, file: str, system: str, signatures: Signatures | None = None
    ) -> AnnotatedFile:
        """Give the workbook with the plan in it, in a system of units, and who has signed the plan."""
        planned = self.shown_in(system)
        with self.speaking:
            return service.annotated_workbook(planned, data, file, signatures=signatures)


class Elsewhere(Protocol):
    """Where what takes long is made. Who asks before it is there gets an error that says so."""

    def reading(self, plan: StoredPlan, who: str) -> Reading:
        """Give how a long list is read."""
        ...

    def planned(self, plan: StoredPlan, who: str) -> PlannedLine:
        """Give the plan of a long list."""
        ...


class Computations:
    """Readings and plans, computed on demand.

    Parameters
    ----------
    size : int
        Plans kept in memory.
    curves : int
        Curves of all of them together.
    elsewhere : Elsewhere
    long_bytes : int
        From this size on a file is read and planned elsewhere.
    """

    def __init__(self, size: int, curves: int, elsewhere: Elsewhere, long_bytes: int) -> None:
        self._readings: Latest[Reading] = Latest(size, lambda found: len(found.curves), curves)
        self._plans: Latest[Computed] = Latest(size, lambda found: len(found.planned.plan.curves), curves)
        self._elsewhere, self._long_bytes = elsewhere, long_bytes

    def is_long(self, file_size: int) -> bool:
        """Tell whether a file of some bytes is read and planned elsewhere."""
        return file_size >= self._long_bytes

    def reading(self, plan: StoredPlan, who: str, data: Bytes) -> Reading:
        """Give how a plan's file is read under its decisions.

        Parameters
        ----------
        plan : StoredPlan
        who : str
            Who asks.
        data : callable
            Gives the bytes of the file where they are needed.

        Raises
        ------
        CantError
            The file, or an answer, cannot be used.
        """
        basis = Basis(plan.file_name, plan.file_digest, plan.decided)

        def make() -> Reading:
            if self.is_long(plan.file_size):
                return self._elsewhere.reading(plan, who)
            return basis.read(data())

        return self._readings.get(basis.key(READING_KINDS), make)

    def keep_reading(self, plan: StoredPlan, reading: Reading) -> None:
        """Keep a reading that was made before the plan was stored."""
        basis = Basis(plan.file_name, plan.file_digest, plan.decided)
        self._readings.put(basis.key(READING_KINDS), reading)

    def planned(self, plan: StoredPlan, who: str, data: Bytes) -> Computed:
        """Give the plan that follows from a file and its decisions.

        Raises
        ------
        CantError
            There is no traffic, or there are no limits, or a table cannot be used.
        """
        basis = Basis(plan.file_name, plan.file_digest, plan.decided)

        def make() -> Computed:
            if self.is_long(plan.file_size):
                return Computed(self._elsewhere.planned(plan, who))
            return Computed(basis.plan(self.reading(plan, who, data)))

        return self._plans.get(basis.key(PLAN_KINDS), make)
