"""The tables of the database: plans as inputs and decisions, files, and limits kept under a name.

Nothing computed is stored: a result follows from the file and the decisions, and can be made again.
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
