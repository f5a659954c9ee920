"""What the JSON interface takes and gives; plans and records are the models of :mod:`cant.model`."""

from __future__ import annotations

import math
from datetime import datetime
from typing import Annotated, Any, Literal, cast

from pydantic import BaseModel, ConfigDict, Field

from cant.model.limits import Condition, LimitRow, LimitSet, Quantity
from cant.model.plan import CurveRecord, Status
from cant.model.settings import METHODS, Constant, RailSpacing, Settings, Tolerance
from cant.model.traffic import Traffic, TrainClass
from cant.units import UNITS
from webapp.forms import LARGEST
from webapp.keeping.access import Access
from webapp.keeping.store import StoredPlan
from webapp.keeping.work import Piece
from webapp.working.orders import WORDS

Amount = Annotated[float, Field(ge=0, le=LARGEST, allow_inf_nan=False)]
Number = Annotated[float, Field(ge=-LARGEST, le=LARGEST, allow_inf_nan=False)]
Name = Annotated[str, Field(min_length=1, max_length=80, pattern=r"^[^\x00-\x1f\x7f]*\S[^\x00-\x1f\x7f]*$")]
Words = Annotated[str, Field(max_length=300, pattern=r"^[^\x00-\x1f\x7f]*$")]
Unlimited = Literal["none"]
WorkState = Literal["waiting", "under way", "done", "refused", "failed", "cancelled"]
ACCESS: dict[Access, Literal["own", "edit", "read"]] = {
    Access.OWN: "own",
    Access.EDIT: "edit",
    Access.READ: "read",
}


class Taken(BaseModel):
    """What a program sends: nothing unknown, and numbers are numbers."""

    model_config = ConfigDict(extra="forbid", strict=True)


class Given(BaseModel):
    """What a program gets: keys may be added later."""

    model_config = ConfigDict(extra="allow")


class ErrorText(Given):
    """What is wrong, and what would be right."""

    status: int
    message: str


class ErrorAnswer(Given):
    """The answer to every call that fails."""

    error: ErrorText


class PlanSummary(Given):
    """A plan as kept, and what the caller may do with it.

    ``key`` comes with the first plan of a program that sent neither key nor cookie; ``steps`` counts the
    decisions of its history, to be sent as ``known`` with the next one.
    """

    address: str
    name: str
    file: str
    sha256: str
    size: int
    created: datetime
    changed: datetime
    expires: datetime
    decided: list[str]
    access: Literal["own", "edit", "read"]
    steps: int
    links: dict[str, str]
    key: str | None = None

    @classmethod
    def of(cls, plan: StoredPlan, key: str | None = None) -> PlanSummary:
        """Make the summary of a plan."""
        base = f"/api/v1/plans/{plan.address}"
        links = {name: f"{base}/{name}" for name in ("reading", "result", "curves", "workbook")}
        return cls(
            address=plan.address,
            name=plan.name,
            file=plan.file_name,
            sha256=plan.file_digest,
            size=plan.file_size,
            created=plan.created,
            changed=plan.changed,
            expires=plan.expires,
            decided=sorted(kind for kind, text in plan.decided.texts.items() if text != "null"),
            access=ACCESS[plan.access],
            steps=len(plan.history),
            links={**links, "page": f"/plans/{plan.address}"},
            key=key,
        )


class WorkAnswer(Given):
    """Long work: ``before`` pieces are taken up first; ``message`` says why it ended undone."""

    id: str
    what: str
    state: WorkState
    share: float
    doing: str
    message: str
    before: int
    links: dict[str, str]

    @classmethod
    def of(cls, piece: Piece, address: str, before: int) -> WorkAnswer:
        """Make the answer of a piece of a plan's work."""
        return cls(
            id=piece.address,
            what=WORDS[piece.kind],
            state=cast("WorkState", piece.state),
            share=piece.share,
            doing=piece.doing,
            message=piece.message,
            before=before,
            links={"self": f"/api/v1/plans/{address}/pieces/{piece.address}"},
        )


class WorkList(Given):
    """The long work of a plan."""

    work: list[WorkAnswer]


class PlanList(Given):
    """The plans of the caller."""

    plans: list[PlanSummary]


class ReadingAnswer(Given):
    """How the file is read: questions, columns, rejected rows (as ``cant read --json`` has it)."""

    questions: list[dict[str, Any]]
    rejected: list[dict[str, Any]]


class AnswersBody(Taken):
    """Answers and corrections, as ``--reading`` takes them; both empty takes everything back."""

    answers: dict[str, dict[str, str | list[str]]] = Field(default_factory=dict)
    columns: dict[str, dict[str, dict[Literal["meaning", "unit"], str] | Literal["ignore"]]] = Field(
        default_factory=dict
    )


class TrainBody(Taken):
    """One class of train; see :class:`cant.model.traffic.TrainClass`."""

    name: Name
    category: Name
    speed_kmh: Amount | None = None
    trains_per_day: Amount | None = None
    mass_t: Amount | None = None
    roll_coefficient: Annotated[float, Field(ge=-1, le=LARGEST, allow_inf_nan=False)] | None = None
    centre_of_gravity_m: Amount | None = None
    regular: bool = True
    line: Words = ""
    track: Words = ""


class TrafficBody(Taken):
    """The traffic that replaces the file's."""

    rows: Annotated[list[TrainBody], Field(min_length=1, max_length=200)]

    def traffic(self) -> Traffic:
        """Give the traffic."""
        rows = [row.model_dump() for row in self.rows]
        return Traffic.of(
            TrainClass(**{**row, "category": row["category"].strip().lower(), "name": row["name"].strip()})
            for row in rows
        )


class LimitBody(Taken):
    """One rule; see :class:`cant.model.limits.LimitRow`. ``none``: not limited there."""

    quantity: Quantity
    normal: Number | Unlimited
    exceptional: Number | Unlimited | None = None
    unit: Literal[tuple(UNITS)]  # type: ignore[valid-type]
    category: Words = ""
    situation: Words = ""
    speed_over_kmh: Condition = None
    speed_up_to_kmh: Condition = None
    radius_over_m: Condition = None
    radius_up_to_m: Condition = None
    per_metre_of_radius: Number = 0.0
    kind: Literal["design", "ceiling"] = "design"
    clause: Words = ""
    note: Words = ""

    def row(self) -> LimitRow:
        """Give the rule."""
        values = self.model_dump()
        for name in ("normal", "exceptional"):
            values[name] = math.inf if values[name] == "none" else values[name]
        return LimitRow(**{**values, **{k: values[k].strip().lower() for k in ("category", "situation")}})


class LimitsBody(Taken):
    """The limits that replace the file's: a set by its name, or rules of your own under a name."""

    name: Name
    rows: Annotated[list[LimitBody], Field(min_length=1, max_length=1000)] | None = None

    def own(self) -> LimitSet:
        """Give the limits where rules were sent."""
        return LimitSet(name=self.name, title=self.name, rows=tuple(row.row() for row in self.rows or ()))


class SettingsBody(Taken):
    """How cants are chosen; see :class:`cant.model.settings.Settings`."""

    rail_spacing_mm: RailSpacing | None = None
    equilibrium_constant: Constant | None = None
    method: Literal[METHODS] = "rms"  # type: ignore[valid-type]
    tiers: Literal["normal", "normal, exceptional"] = "normal"
    keep_within_mm: Tolerance = 0.0
    maintenance_allowance_mm: Tolerance | None = None
    fraction_of_fastest: Annotated[float, Field(gt=0, le=1, allow_inf_nan=False)] = 0.65
    underbalance_mm: Tolerance = 25.0
    today_within_mm: Tolerance = 20.0
    units: Literal["metric", "us"] = "metric"

    def settings(self) -> Settings:
        """Give the settings."""
        return Settings(**{**self.model_dump(), "tiers": tuple(self.tiers.split(", "))})


class ReasonBody(Taken):
    """Why something is decided, and by whom."""

    because: Annotated[
        str, Field(min_length=1, max_length=300, pattern=r"^[^\x00-\x1f\x7f]*\S[^\x00-\x1f\x7f]*$")
    ]
    who: Annotated[str, Field(max_length=80, pattern=r"^[^\x00-\x1f\x7f]*$")] = ""


class HeldBody(ReasonBody):
    """A cant held by hand."""

    cant_mm: Annotated[float, Field(ge=0, le=300, allow_inf_nan=False)]


class HistoryStep(Given):
    """One decision of the history."""

    step: int
    kind: str
    words: str
    reason: str
    who: str
    made: datetime


class HistoryAnswer(Given):
    """Every decision, oldest first, and the changes that hold."""

    steps: list[HistoryStep]
    changes: list[dict[str, Any]]


class KnownQuery(Taken):
    """How many decisions of the plan the caller has seen: a later one is not silently replaced."""

    model_config = ConfigDict(extra="forbid", strict=False)

    known: Annotated[int | None, Field(ge=0, le=1_000_000)] = None


class CurvesQuery(Taken):
    """Which curves, in which order."""

    model_config = ConfigDict(extra="forbid", strict=False)

    status: list[Status] = Field(default_factory=list)
    search: Annotated[str, Field(max_length=100)] = ""
    track: Annotated[str, Field(max_length=400)] = ""
    sort: Literal["list", "name", "chainage", "radius", "today", "proposed", "change", "status"] = "list"
    order: Literal["rising", "falling"] = "rising"
    page: Annotated[int, Field(ge=1, le=1_000_000)] = 1
    size: Literal["25", "50", "100", "250"] = "50"


class NumberedCurve(CurveRecord):
    """A curve with its number in the list, counted from 1."""

    number: int


class CurvesAnswer(Given):
    """A page of curves."""

    total: int
    page: int
    pages: int
    counts: dict[str, int]
    curves: list[NumberedCurve]


class LimitSetEntry(Given):
    """A limit set that comes with the program."""

    name: str
    title: str
    edition: str
    verified: bool
    completeness: str


class LimitSetList(Given):
    """All limit sets that come with the program."""

    sets: list[LimitSetEntry]


class LimitSetAnswer(LimitSetEntry):
    """One limit set with its rules, by canonical headings."""

    rows: list[dict[str, Any]]
