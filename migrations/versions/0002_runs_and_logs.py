"""Calibration runs as they were typed, and the logs of standard lots and instruments."""

import sqlalchemy as sa
from alembic import op

revision = "0002"
down_revision = "0001"
branch_labels = None
depends_on = None


def upgrade():
    # a batch rebuild would lose the triggers of the table
    op.execute("ALTER TABLE calibration ADD COLUMN run TEXT")
    op.create_table(
        "log",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("kind", sa.Text(), nullable=False),
        sa.Column("thing_id", sa.String(length=36), nullable=False),
        sa.Column("what", sa.Text(), nullable=False),
        sa.Column("document", sa.Text(), nullable=False),
        sa.Column("strikes", sa.String(length=36), nullable=True),
        sa.Column("reason", sa.Text(), nullable=True),
        sa.Column("person_id", sa.String(length=36), nullable=False),
        sa.Column("at", sa.BigInteger(), nullable=False),
        sa.ForeignKeyConstraint(["person_id"], ["person.id"], name="fk_log_person_id_person"),
        sa.ForeignKeyConstraint(["strikes"], ["log.id"], name="fk_log_strikes_log"),
        sa.PrimaryKeyConstraint("id", name="pk_log"),
        sa.UniqueConstraint("strikes", name="uq_log_strikes"),
    )
    op.create_index("ix_log_thing_id", "log", ["thing_id"], unique=False)
    if op.get_bind().dialect.name == "postgresql":
        for event in ("UPDATE", "DELETE"):
            name = f"log_no_{event.lower()}"
            op.execute(
                f"CREATE FUNCTION refuse_{name}() RETURNS trigger LANGUAGE plpgsql AS $$ "
                f"BEGIN RAISE EXCEPTION 'log is in ink: no {event}'; END $$"
            )
            op.execute(
                f"CREATE TRIGGER {name} BEFORE {event} ON log "
                f"FOR EACH ROW EXECUTE FUNCTION refuse_{name}()"
            )
        op.execute(
            "CREATE TRIGGER log_no_truncate BEFORE TRUNCATE ON log "
            "FOR EACH STATEMENT EXECUTE FUNCTION refuse_truncate()"
        )
        return
    for event in ("UPDATE", "DELETE"):
        op.execute(
            f"CREATE TRIGGER log_no_{event.lower()} BEFORE {event} ON log FOR EACH ROW "
            f"BEGIN SELECT RAISE(ABORT, 'log is in ink: no {event}'); END"
        )
    op.execute(
        "CREATE TRIGGER log_no_replace_by_insert BEFORE INSERT ON log FOR EACH ROW "
        "WHEN EXISTS (SELECT 1 FROM log WHERE id = NEW.id OR strikes = NEW.strikes) "
        "BEGIN SELECT RAISE(ABORT, 'log has this row already: no REPLACE'); END"
    )
