"""The office: a queue of long work and its results, share links, accounts, sign-ins and signatures."""

import sqlalchemy as sa
from alembic import op

revision = "0003"
down_revision = "0002"
branch_labels = None
depends_on = None

MOMENT = sa.DateTime(timezone=True)


def _key() -> sa.Column[int]:
    return sa.Column("id", sa.Integer, primary_key=True)


def _of(name: str, table: str, on_delete: str, *, needed: bool = True) -> sa.Column[int]:
    """Give a column that refers to a row of another table."""
    refers = sa.ForeignKey(f"{table}.id", ondelete=on_delete)
    return sa.Column(name, sa.Integer, refers, nullable=not needed, index=True)


def _text(name: str, length: int) -> sa.Column[str]:
    return sa.Column(name, sa.String(length), nullable=False, server_default="")


def _moment(name: str, *, needed: bool = True, index: bool = False) -> sa.Column[object]:
    return sa.Column(name, MOMENT, nullable=not needed, index=index)


def upgrade() -> None:
    """Make the tables."""
    _work()
    _sharing()
    _people()
    op.add_column("decisions", _text("account", 64))


def _work() -> None:
    op.create_table(
        "work",
        _key(),
        sa.Column("address", sa.String(64), nullable=False, unique=True),
        sa.Column("key", sa.String(160), nullable=False),
        _of("plan_id", "plans", "CASCADE"),
        sa.Column("asked_by", sa.String(64), nullable=False, index=True),
        sa.Column("kind", sa.String(16), nullable=False),
        sa.Column("content", sa.Text, nullable=False),
        sa.Column("state", sa.String(16), nullable=False, index=True),
        sa.Column("share", sa.Double, nullable=False),
        _text("doing", 120),
        sa.Column("message", sa.Text, nullable=False, server_default=""),
        sa.Column("attempts", sa.Integer, nullable=False),
        _text("worker", 64),
        _moment("made"),
        _moment("beat", needed=False),
        _moment("ended", needed=False),
        sa.UniqueConstraint("plan_id", "key"),
    )
    op.create_table(
        "results",
        _key(),
        sa.Column("key", sa.String(160), nullable=False, index=True),
        _of("plan_id", "plans", "CASCADE"),
        sa.Column("kind", sa.String(16), nullable=False),
        sa.Column("data", sa.LargeBinary, nullable=False),
        sa.Column("size", sa.BigInteger, nullable=False),
        _moment("made"),
        _moment("used", index=True),
        sa.UniqueConstraint("plan_id", "key"),
    )


def _sharing() -> None:
    op.create_table(
        "shares",
        _key(),
        _of("plan_id", "plans", "CASCADE"),
        sa.Column("secret_digest", sa.String(64), nullable=False, unique=True),
        _text("label", 80),
        sa.Column("may_edit", sa.Boolean, nullable=False),
        _moment("made"),
        _moment("expires", needed=False),
    )
    op.create_table(
        "grants",
        _key(),
        _of("plan_id", "plans", "CASCADE"),
        _of("share_id", "shares", "CASCADE", needed=False),
        sa.Column("holder", sa.String(64), nullable=False, index=True),
        sa.Column("may_edit", sa.Boolean, nullable=False),
        _moment("made"),
        _moment("expires", needed=False),
        sa.UniqueConstraint("plan_id", "holder", "share_id"),
    )


def _people() -> None:
    op.create_table(
        "accounts",
        _key(),
        sa.Column("name", sa.String(80), nullable=False, unique=True),
        _text("full_name", 80),
        _text("password_hash", 255),
        sa.Column("must_change", sa.Boolean, nullable=False),
        _moment("password_expires", needed=False),
        _text("second_factor", 255),
        sa.Column("second_factor_used", sa.BigInteger, nullable=False, server_default="0"),
        _text("roles", 64),
        sa.Column("disabled", sa.Boolean, nullable=False),
        sa.Column("failed", sa.Integer, nullable=False),
        _moment("locked_until", needed=False),
        _moment("made"),
        _moment("seen", needed=False),
    )
    op.create_table(
        "sign_ins",
        _key(),
        sa.Column("secret_digest", sa.String(64), nullable=False, unique=True),
        _of("account_id", "accounts", "CASCADE"),
        sa.Column("is_key", sa.Boolean, nullable=False),
        _text("browser", 120),
        _moment("made"),
        _moment("seen"),
        _moment("expires", index=True),
    )
    op.create_table(
        "signatures",
        _key(),
        _of("plan_id", "plans", "CASCADE"),
        _of("account_id", "accounts", "SET NULL", needed=False),
        sa.Column("step", sa.String(16), nullable=False),
        _text("name", 160),
        sa.Column("note", sa.Text, nullable=False, server_default=""),
        sa.Column("statement", sa.Text, nullable=False, server_default=""),
        sa.Column("digest", sa.String(64), nullable=False),
        _text("program", 32),
        _of("handed_to", "accounts", "SET NULL", needed=False),
        _moment("made"),
        _moment("withdrawn", needed=False),
    )


def downgrade() -> None:
    """Drop the tables."""
    with op.batch_alter_table("decisions") as decisions:
        decisions.drop_column("account")
    for table in ("signatures", "sign_ins", "accounts", "grants", "shares", "results", "work"):
        op.drop_table(table)
