"""Who made a decision: the name that the engineer gives, blank where he gives none."""

import sqlalchemy as sa
from alembic import op

revision = "0002"
down_revision = "0001"
branch_labels = None
depends_on = None


def upgrade() -> None:
    """Add the column; decisions made before have no name."""
    op.add_column("decisions", sa.Column("who", sa.String(80), nullable=False, server_default=""))


def downgrade() -> None:
    """Drop the column."""
    op.drop_column("decisions", "who")
