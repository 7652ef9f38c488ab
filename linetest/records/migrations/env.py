"""Runs the migrations over the connection that the store hands in."""

from __future__ import annotations

from alembic import context

from linetest.records.tables import metadata

context.configure(
    connection=context.config.attributes["connection"],
    target_metadata=metadata,
    # SQLite cannot alter most of a table in place; batch mode copies it.
    render_as_batch=True,
    transaction_per_migration=True,
)
with context.begin_transaction():
    context.run_migrations()
