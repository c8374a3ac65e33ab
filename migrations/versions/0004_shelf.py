"""Uses of bottles, tokens of scripts, watches, letters; a bottle opened; the trail by thing."""

import sqlalchemy as sa
from alembic import op

revision = "0004"
down_revision = "0003"
branch_labels = None
depends_on = None

INK = ("bottle_use",)
KEPT = ("access_token", "watch", "letter")

# (name, table, event, what must not be, what is said); NEW is the row that is to be written.
RULES = (
    (
        "access_token_no_more",
        "access_token",
        "UPDATE",
        """
        NEW.digest <> OLD.digest OR NEW.person_id <> OLD.person_id OR NEW.scopes <> OLD.scopes
        OR NEW.expires_at <> OLD.expires_at
        OR (OLD.revoked_at IS NOT NULL
            AND (NEW.revoked_at IS NULL OR NEW.revoked_at <> OLD.revoked_at))
        """,
        "a token is never changed, only revoked",
    ),
    (
        "bottle_opened_once",
        "bottle",
        "UPDATE",
        """
        OLD.opened_at IS NOT NULL
        AND (NEW.opened_at IS NULL OR NEW.opened_at <> OLD.opened_at)
        """,
        "a bottle is opened once",
    ),
)


def upgrade():
    # a batch rebuild would lose the triggers of the table; SQLite adds one column at a time
    op.execute("ALTER TABLE bottle ADD COLUMN opened_at BIGINT")
    op.execute("ALTER TABLE bottle ADD COLUMN opened_until BIGINT")
    op.execute(
        "ALTER TABLE bottle ADD COLUMN opened_by VARCHAR(36) "
        "CONSTRAINT fk_bottle_opened_by_person REFERENCES person (id)"
    )
    # what happened to one thing is asked on its own page
    op.create_index("ix_trail_thing_id", "trail", ["thing_id"])
    _access_token()
    _bottle_use()
    _watch_and_letters()
    if op.get_bind().dialect.name == "postgresql":
        _triggers_of_postgresql()
    else:
        _triggers_of_sqlite()


def _access_token():
    op.create_table(
        "access_token",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("person_id", sa.String(length=36), nullable=False),
        sa.Column("name", sa.Text(), nullable=False),
        sa.Column("digest", sa.Text(), nullable=False),
        sa.Column("scopes", sa.Text(), nullable=False),
        sa.Column("made_at", sa.BigInteger(), nullable=False),
        sa.Column("expires_at", sa.BigInteger(), nullable=False),
        sa.Column("revoked_at", sa.BigInteger(), nullable=True),
        sa.Column("revoked_by", sa.String(length=36), nullable=True),
        sa.Column("seen_at", sa.BigInteger(), nullable=True),
        sa.ForeignKeyConstraint(
            ["person_id"], ["person.id"], name="fk_access_token_person_id_person"
        ),
        sa.ForeignKeyConstraint(
            ["revoked_by"], ["person.id"], name="fk_access_token_revoked_by_person"
        ),
        sa.PrimaryKeyConstraint("id", name="pk_access_token"),
        sa.UniqueConstraint("digest", name="uq_access_token_digest"),
    )
    op.create_index("ix_access_token_person_id", "access_token", ["person_id"], unique=False)


def _bottle_use():
    op.create_table(
        "bottle_use",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("bottle_id", sa.String(length=36), nullable=False),
        sa.Column("result_id", sa.Text(), nullable=False),
        sa.Column("certificate_number", sa.Text(), nullable=False),
        sa.Column("used_at", sa.BigInteger(), nullable=False),
        sa.Column("says", sa.Text(), nullable=False),
        sa.Column("strikes", sa.String(length=36), nullable=True),
        sa.Column("reason", sa.Text(), nullable=True),
        sa.Column("person_id", sa.String(length=36), nullable=False),
        sa.Column("token_id", sa.String(length=36), nullable=True),
        sa.Column("at", sa.BigInteger(), nullable=False),
        sa.ForeignKeyConstraint(
            ["bottle_id"], ["bottle.id"], name="fk_bottle_use_bottle_id_bottle"
        ),
        sa.ForeignKeyConstraint(
            ["strikes"], ["bottle_use.id"], name="fk_bottle_use_strikes_bottle_use"
        ),
        sa.ForeignKeyConstraint(
            ["person_id"], ["person.id"], name="fk_bottle_use_person_id_person"
        ),
        sa.ForeignKeyConstraint(
            ["token_id"], ["access_token.id"], name="fk_bottle_use_token_id_access_token"
        ),
        sa.PrimaryKeyConstraint("id", name="pk_bottle_use"),
        sa.UniqueConstraint("strikes", name="uq_bottle_use_strikes"),
    )
    op.create_index("ix_bottle_use_bottle_id", "bottle_use", ["bottle_id"], unique=False)


def _watch_and_letters():
    op.create_table(
        "watch",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("person_id", sa.String(length=36), nullable=False),
        sa.Column("kind", sa.Text(), nullable=False),
        sa.Column("thing_id", sa.String(length=36), nullable=False),
        sa.Column("began_at", sa.BigInteger(), nullable=False),
        sa.Column("ended_at", sa.BigInteger(), nullable=True),
        sa.ForeignKeyConstraint(["person_id"], ["person.id"], name="fk_watch_person_id_person"),
        sa.PrimaryKeyConstraint("id", name="pk_watch"),
    )
    op.create_index(
        "uq_watch_standing",
        "watch",
        ["person_id", "kind", "thing_id"],
        unique=True,
        sqlite_where=sa.text("ended_at IS NULL"),
        postgresql_where=sa.text("ended_at IS NULL"),
    )
    op.create_table(
        "mailbox",
        sa.Column("person_id", sa.String(length=36), nullable=False),
        sa.Column("read_until", sa.BigInteger(), nullable=True),
        sa.Column("address", sa.Text(), nullable=False),
        sa.Column("address_since", sa.BigInteger(), nullable=True),
        sa.ForeignKeyConstraint(["person_id"], ["person.id"], name="fk_mailbox_person_id_person"),
        sa.PrimaryKeyConstraint("person_id", name="pk_mailbox"),
    )
    op.create_table(
        "letter",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("watch_id", sa.String(length=36), nullable=False),
        sa.Column("changed_at", sa.BigInteger(), nullable=False),
        sa.Column("address", sa.Text(), nullable=False),
        sa.Column("subject", sa.Text(), nullable=False),
        sa.Column("body", sa.Text(), nullable=False),
        sa.Column("next_try_at", sa.BigInteger(), nullable=False),
        sa.Column("tries", sa.Integer(), nullable=False),
        sa.Column("sent_at", sa.BigInteger(), nullable=True),
        sa.Column("problem", sa.Text(), nullable=True),
        sa.ForeignKeyConstraint(["watch_id"], ["watch.id"], name="fk_letter_watch_id_watch"),
        sa.PrimaryKeyConstraint("id", name="pk_letter"),
        sa.UniqueConstraint("watch_id", "changed_at", name="uq_letter_watch_id_changed_at"),
    )


def _refusals():
    """Return (trigger, table, event, condition or None, words) of all triggers."""
    refused = [
        (f"{table}_no_{event.lower()}", table, event, None, f"{table} is in ink: no {event}")
        for table in INK
        for event in ("UPDATE", "DELETE")
    ]
    refused += [
        (f"{table}_no_delete", table, "DELETE", None, f"{table} is kept: no DELETE")
        for table in KEPT
    ]
    return [*refused, *RULES]


def _triggers_of_sqlite():
    for name, table, event, condition, words in _refusals():
        when = f"WHEN {condition}" if condition else ""
        op.execute(
            f"CREATE TRIGGER {name} BEFORE {event} ON {table} FOR EACH ROW {when} "
            f"BEGIN SELECT RAISE(ABORT, '{words}'); END"
        )
    for table in (*INK, *KEPT):
        _no_replacing(table)


def _no_replacing(table):
    """Refuse INSERT OR REPLACE and UPDATE OR REPLACE: they delete rows past the DELETE triggers."""
    connection = op.get_bind()
    columns = connection.exec_driver_sql(f"PRAGMA table_info({table})").fetchall()
    keys = {tuple(row[1] for row in sorted(columns, key=lambda row: row[5]) if row[5])}
    for index in connection.exec_driver_sql(f"PRAGMA index_list({table})").fetchall():
        if index[2] and not index[4]:  # a partial index does not hold for every row
            parts = connection.exec_driver_sql(f"PRAGMA index_info({index[1]})").fetchall()
            keys.add(tuple(row[2] for row in parts))
    same = " OR ".join(
        "(" + " AND ".join(f'"{name}" = NEW."{name}"' for name in key) + ")" for key in sorted(keys)
    )
    if table == "watch":
        same += (
            ' OR ("ended_at" IS NULL AND NEW."ended_at" IS NULL AND "person_id" = NEW."person_id"'
            ' AND "kind" = NEW."kind" AND "thing_id" = NEW."thing_id")'
        )
    for event, other in (("INSERT", ""), ("UPDATE", " AND rowid <> OLD.rowid")):
        op.execute(
            f"CREATE TRIGGER {table}_no_replace_by_{event.lower()} BEFORE {event} ON {table} "
            f"FOR EACH ROW WHEN EXISTS (SELECT 1 FROM {table} WHERE ({same}){other}) "
            f"BEGIN SELECT RAISE(ABORT, '{table} has this row already: no REPLACE'); END"
        )


def _triggers_of_postgresql():
    for name, table, event, condition, words in _refusals():
        test = f"IF {condition} THEN RAISE EXCEPTION '{words}'; END IF;"
        body = test if condition else f"RAISE EXCEPTION '{words}';"
        op.execute(
            f"CREATE FUNCTION refuse_{name}() RETURNS trigger LANGUAGE plpgsql AS $$ "
            f"BEGIN {body} RETURN {'OLD' if event == 'DELETE' else 'NEW'}; END $$"
        )
        op.execute(
            f"CREATE TRIGGER {name} BEFORE {event} ON {table} "
            f"FOR EACH ROW EXECUTE FUNCTION refuse_{name}()"
        )
    # row triggers do not see a TRUNCATE
    for table in (*INK, *KEPT):
        op.execute(
            f"CREATE TRIGGER {table}_no_truncate BEFORE TRUNCATE ON {table} "
            "FOR EACH STATEMENT EXECUTE FUNCTION refuse_truncate()"
        )
