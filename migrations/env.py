"""Runs migrations on the connection that electrolog.record.migrate hands over (the only way they are run)."""

from alembic import context

from electrolog.record.constraints import full_metadata

connection = context.config.attributes["connection"]
context.configure(
    connection=connection,
    target_metadata=full_metadata(),
    render_as_batch=True,
    transactional_ddl=True,
)
with context.begin_transaction():
    context.run_migrations()
