"""The tables of the database.

What counts is a plan's file and the decisions on it. Work and results are kept beside them only to be quick:
a result follows from file and decisions and can be made again. What belongs to a plan goes with it.
"""

from __future__ import annotations

from datetime import UTC, datetime

from sqlalchemy import (
    BigInteger,
    DateTime,
    Dialect,
    ForeignKey,
    LargeBinary,
    String,
    Text,
    TypeDecorator,
    UniqueConstraint,
)
from sqlalchemy.orm import DeclarativeBase, Mapped, mapped_column, relationship


class UtcTime(TypeDecorator[datetime]):
    """A moment in UTC, also on a database that keeps no time zone."""

    impl = DateTime(timezone=True)
    cache_ok = True

    def process_bind_param(self, value: datetime | None, dialect: Dialect) -> datetime | None:
        """Store as UTC."""
        return None if value is None else value.astimezone(UTC)

    def process_result_value(self, value: datetime | None, dialect: Dialect) -> datetime | None:
        """Give back as UTC."""
        if value is None:
            return None
        return value.replace(tzinfo=UTC) if value.tzinfo is None else value.astimezone(UTC)


class Base(DeclarativeBase):
    """Base of the tables."""


class PlanRow(Base):
    """A plan: whose it is, what it is called, how long it is kept."""

    __tablename__ = "plans"

    id: Mapped[int] = mapped_column(primary_key=True)
    address: Mapped[str] = mapped_column(String(64), unique=True)
    owner: Mapped[str] = mapped_column(String(64), index=True)
    name: Mapped[str] = mapped_column(String(200))
    file_name: Mapped[str] = mapped_column(String(255))
    file_digest: Mapped[str] = mapped_column(String(64))
    file_size: Mapped[int] = mapped_column(BigInteger)
    created: Mapped[datetime] = mapped_column(UtcTime)
    changed: Mapped[datetime] = mapped_column(UtcTime)
    expires: Mapped[datetime] = mapped_column(UtcTime, index=True)
    decisions: Mapped[list[DecisionRow]] = relationship(
        cascade="all, delete-orphan", order_by="DecisionRow.number", lazy="selectin"
    )


class FileRow(Base):
    """The bytes of a plan's file, apart so that no page loads them without need."""

    __tablename__ = "files"

    plan_id: Mapped[int] = mapped_column(ForeignKey("plans.id", ondelete="CASCADE"), primary_key=True)
    data: Mapped[bytes] = mapped_column(LargeBinary)


class DecisionRow(Base):
    """One decision of the engineer over the unchanged file; the last of a kind rules."""

    __tablename__ = "decisions"
    __table_args__ = (UniqueConstraint("plan_id", "number"),)

    id: Mapped[int] = mapped_column(primary_key=True)
    plan_id: Mapped[int] = mapped_column(ForeignKey("plans.id", ondelete="CASCADE"), index=True)
    number: Mapped[int]
    kind: Mapped[str] = mapped_column(String(32))
    content: Mapped[str] = mapped_column(Text)
    reason: Mapped[str] = mapped_column(Text, default="")
    made: Mapped[datetime] = mapped_column(UtcTime)
    who: Mapped[str] = mapped_column(String(80), default="", server_default="")
    account: Mapped[str] = mapped_column(String(64), default="", server_default="")


class KeptLimitsRow(Base):
    """Limits that somebody keeps under a name for the next plan."""

    __tablename__ = "kept_limits"
    __table_args__ = (UniqueConstraint("owner", "name"),)

    id: Mapped[int] = mapped_column(primary_key=True)
    owner: Mapped[str] = mapped_column(String(64), index=True)
    name: Mapped[str] = mapped_column(String(80))
    content: Mapped[str] = mapped_column(Text)
    changed: Mapped[datetime] = mapped_column(UtcTime)
    expires: Mapped[datetime] = mapped_column(UtcTime, index=True)


class WorkRow(Base):
    """Long work that is waiting, under way or ended: the queue. The same work of a plan stands here once."""

    __tablename__ = "work"
    __table_args__ = (UniqueConstraint("plan_id", "key"),)

    id: Mapped[int] = mapped_column(primary_key=True)
    address: Mapped[str] = mapped_column(String(64), unique=True)
    key: Mapped[str] = mapped_column(String(160))
    plan_id: Mapped[int] = mapped_column(ForeignKey("plans.id", ondelete="CASCADE"), index=True)
    asked_by: Mapped[str] = mapped_column(String(64), index=True)
    kind: Mapped[str] = mapped_column(String(16))
    content: Mapped[str] = mapped_column(Text)
    state: Mapped[str] = mapped_column(String(16), index=True)
    share: Mapped[float] = mapped_column(default=0.0)
    doing: Mapped[str] = mapped_column(String(120), default="")
    message: Mapped[str] = mapped_column(Text, default="")
    attempts: Mapped[int] = mapped_column(default=0)
    worker: Mapped[str] = mapped_column(String(64), default="")
    made: Mapped[datetime] = mapped_column(UtcTime)
    beat: Mapped[datetime | None] = mapped_column(UtcTime)
    ended: Mapped[datetime | None] = mapped_column(UtcTime)


class ResultRow(Base):
    """What long work gave, under the digest of everything it follows from."""

    __tablename__ = "results"

    id: Mapped[int] = mapped_column(primary_key=True)
    key: Mapped[str] = mapped_column(String(160), index=True)
    plan_id: Mapped[int] = mapped_column(ForeignKey("plans.id", ondelete="CASCADE"), index=True)
    kind: Mapped[str] = mapped_column(String(16))
    data: Mapped[bytes] = mapped_column(LargeBinary)
    size: Mapped[int] = mapped_column(BigInteger)
    made: Mapped[datetime] = mapped_column(UtcTime)
    used: Mapped[datetime] = mapped_column(UtcTime, index=True)

    __table_args__ = (UniqueConstraint("plan_id", "key"),)


class ShareRow(Base):
    """A link that opens a plan to who holds it; only the digest of its secret is kept."""

    __tablename__ = "shares"

    id: Mapped[int] = mapped_column(primary_key=True)
    plan_id: Mapped[int] = mapped_column(ForeignKey("plans.id", ondelete="CASCADE"), index=True)
    secret_digest: Mapped[str] = mapped_column(String(64), unique=True)
    label: Mapped[str] = mapped_column(String(80))
    may_edit: Mapped[bool]
    made: Mapped[datetime] = mapped_column(UtcTime)
    expires: Mapped[datetime | None] = mapped_column(UtcTime)


class GrantRow(Base):
    """That somebody who does not own a plan may see it, or edit it: by a share link, or handed to him."""

    __tablename__ = "grants"
    __table_args__ = (UniqueConstraint("plan_id", "holder", "share_id"),)

    id: Mapped[int] = mapped_column(primary_key=True)
    plan_id: Mapped[int] = mapped_column(ForeignKey("plans.id", ondelete="CASCADE"), index=True)
    share_id: Mapped[int | None] = mapped_column(ForeignKey("shares.id", ondelete="CASCADE"), index=True)
    holder: Mapped[str] = mapped_column(String(64), index=True)
    may_edit: Mapped[bool]
    made: Mapped[datetime] = mapped_column(UtcTime)
    expires: Mapped[datetime | None] = mapped_column(UtcTime)


class AccountRow(Base):
    """Somebody who signs in, with a password of ours or at the proxy before us."""

    __tablename__ = "accounts"

    id: Mapped[int] = mapped_column(primary_key=True)
    name: Mapped[str] = mapped_column(String(80), unique=True)
    full_name: Mapped[str] = mapped_column(String(80), default="")
    password_hash: Mapped[str] = mapped_column(String(255), default="")
    must_change: Mapped[bool] = mapped_column(default=False)
    password_expires: Mapped[datetime | None] = mapped_column(UtcTime)
    second_factor: Mapped[str] = mapped_column(String(255), default="")
    second_factor_used: Mapped[int] = mapped_column(BigInteger, default=0)
    roles: Mapped[str] = mapped_column(String(64), default="")
    disabled: Mapped[bool] = mapped_column(default=False)
    failed: Mapped[int] = mapped_column(default=0)
    locked_until: Mapped[datetime | None] = mapped_column(UtcTime)
    made: Mapped[datetime] = mapped_column(UtcTime)
    seen: Mapped[datetime | None] = mapped_column(UtcTime)


class SignInRow(Base):
    """A browser in which an account is signed in, or a key for programs; of its secret the digest is kept."""

    __tablename__ = "sign_ins"

    id: Mapped[int] = mapped_column(primary_key=True)
    secret_digest: Mapped[str] = mapped_column(String(64), unique=True)
    account_id: Mapped[int] = mapped_column(ForeignKey("accounts.id", ondelete="CASCADE"), index=True)
    is_key: Mapped[bool] = mapped_column(default=False)
    browser: Mapped[str] = mapped_column(String(120), default="")
    made: Mapped[datetime] = mapped_column(UtcTime)
    seen: Mapped[datetime] = mapped_column(UtcTime)
    expires: Mapped[datetime] = mapped_column(UtcTime, index=True)


class SignatureRow(Base):
    """A step in signing off a plan as it was at a digest: signed, sent back, or handed to somebody else."""

    __tablename__ = "signatures"

    id: Mapped[int] = mapped_column(primary_key=True)
    plan_id: Mapped[int] = mapped_column(ForeignKey("plans.id", ondelete="CASCADE"), index=True)
    account_id: Mapped[int | None] = mapped_column(ForeignKey("accounts.id", ondelete="SET NULL"), index=True)
    step: Mapped[str] = mapped_column(String(16))
    name: Mapped[str] = mapped_column(String(160))
    note: Mapped[str] = mapped_column(Text, default="")
    statement: Mapped[str] = mapped_column(Text, default="")
    digest: Mapped[str] = mapped_column(String(64))
    program: Mapped[str] = mapped_column(String(32), default="")
    handed_to: Mapped[int | None] = mapped_column(ForeignKey("accounts.id", ondelete="SET NULL"), index=True)
    made: Mapped[datetime] = mapped_column(UtcTime)
    withdrawn: Mapped[datetime | None] = mapped_column(UtcTime)
