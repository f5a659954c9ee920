"""Runs the migrations on the connection that :mod:`webapp.keeping.database` hands over."""

from alembic import context

from webapp.keeping.records import Base

context.configure(
    connection=context.config.attributes["connection"],
    target_metadata=Base.metadata,
    render_as_batch=True,
)
with context.begin_transaction():
    context.run_migrations()
