"""First tables: plans, their files and decisions, limits kept under a name."""

import sqlalchemy as sa
from alembic import op

revision = "0001"
down_revision = None
branch_labels = None
depends_on = None

MOMENT = sa.DateTime(timezone=True)


def upgrade() -> None:
    """Make the tables."""
    op.create_table(
        "plans",
        sa.Column("id", sa.Integer, primary_key=True),
        sa.Column("address", sa.String(64), nullable=False, unique=True),
        sa.Column("owner", sa.String(64), nullable=False, index=True),
        sa.Column("name", sa.String(200), nullable=False),
        sa.Column("file_name", sa.String(255), nullable=False),
        sa.Column("file_digest", sa.String(64), nullable=False),
        sa.Column("file_size", sa.BigInteger, nullable=False),
        sa.Column("created", MOMENT, nullable=False),
        sa.Column("changed", MOMENT, nullable=False),
        sa.Column("expires", MOMENT, nullable=False, index=True),
    )
    op.create_table(
        "files",
        sa.Column("plan_id", sa.Integer, sa.ForeignKey("plans.id", ondelete="CASCADE"), primary_key=True),
        sa.Column("data", sa.LargeBinary, nullable=False),
    )
    op.create_table(
        "decisions",
        sa.Column("id", sa.Integer, primary_key=True),
        sa.Column(
            "plan_id",
            sa.Integer,
            sa.ForeignKey("plans.id", ondelete="CASCADE"),
            nullable=False,
            index=True,
        ),
        sa.Column("number", sa.Integer, nullable=False),
        sa.Column("kind", sa.String(32), nullable=False),
        sa.Column("content", sa.Text, nullable=False),
        sa.Column("reason", sa.Text, nullable=False),
        sa.Column("made", MOMENT, nullable=False),
        sa.UniqueConstraint("plan_id", "number"),
    )
    op.create_table(
        "kept_limits",
        sa.Column("id", sa.Integer, primary_key=True),
        sa.Column("owner", sa.String(64), nullable=False, index=True),
        sa.Column("name", sa.String(80), nullable=False),
        sa.Column("content", sa.Text, nullable=False),
        sa.Column("changed", MOMENT, nullable=False),
        sa.Column("expires", MOMENT, nullable=False, index=True),
        sa.UniqueConstraint("owner", "name"),
    )


def downgrade() -> None:
    """Drop the tables."""
    for table in ("kept_limits", "decisions", "files", "plans"):
        op.drop_table(table)
