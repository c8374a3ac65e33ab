"""SQLAlchemy: engine, transaction, columns, tables, queries, trail; the only home of SQL."""
