"""Alembic's door: it is given a connection with a transaction begun, and leaves both to the caller."""

from __future__ import annotations

from alembic import context

from corelab.records import schema

connection = context.config.attributes.get("connection")
if connection is None:
    raise SystemExit("migrations run through 'corelab setup'")
context.configure(
    connection=connection,
    target_metadata=schema.metadata,
    transactional_ddl=True,
    transaction_per_migration=False,
    render_as_batch=True,
)
context.run_migrations()
