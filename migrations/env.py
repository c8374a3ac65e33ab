"""Alembic's environment: runs on the connection that the program hands in."""

from alembic import context

from server.records.tables import bench, lots, people, shelf, stores, trail
from server.records.tables.base import Table

# each module has put its tables into the one metadata
TABLES = (bench, lots, people, shelf, stores, trail)

context.configure(
    connection=context.config.attributes["connection"],
    target_metadata=Table.metadata,
    render_as_batch=True,
    transactional_ddl=True,
)
context.run_migrations()
