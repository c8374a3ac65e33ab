"""The first tables, and the triggers that keep ink and trail as they were written."""

import sqlalchemy as sa
from alembic import op

revision = "0001"
down_revision = None
branch_labels = None
depends_on = None

# Rows of these tables are never changed and never deleted.
INK = ("entry", "evaluation", "signature", "certificate", "trail", "recipe", "calibration", "file")
# Rows of these are changed by acts, but stay.
KEPT = ("sheet", "lot", "bottle", "pull", "hold", "person", "instrument", "standard_lot")

GENESIS = "0" * 64

# (name, table, event, what must not be, what is said); NEW is the row that is to be written.
RULES = (
    (
        "signature_second_person",
        "signature",
        "INSERT",
        """
        NEW.meaning = 'countersigned'
        AND NOT EXISTS (SELECT 1 FROM laboratory WHERE own_signature)
        AND EXISTS (
            SELECT 1 FROM sheet JOIN lot ON lot.id = sheet.lot_id
            WHERE sheet.id = NEW.sheet_id AND (
                lot.made_by = NEW.person_id
                OR sheet.overrides LIKE '%"by":"' || NEW.person_id || '"%'
                OR EXISTS (
                    SELECT 1 FROM entry WHERE entry.sheet_id = NEW.sheet_id
                    AND (entry.person_id = NEW.person_id OR entry.posted_by = NEW.person_id)
                )
                OR EXISTS (
                    SELECT 1 FROM signature AS other WHERE other.sheet_id = NEW.sheet_id
                    AND other.meaning = 'measured' AND other.person_id = NEW.person_id
                )
            )
        )
        """,
        "nobody countersigns the own work",
    ),
    (
        "signature_no_steward",
        "signature",
        "INSERT",
        """
        EXISTS (
            SELECT 1 FROM person WHERE person.id = NEW.person_id
            AND person.roles LIKE '%"steward"%'
        )
        """,
        "a steward signs nothing",
    ),
    (
        "hold_second_person",
        "hold",
        "UPDATE",
        "NEW.released_by = NEW.held_by",
        "nobody releases the own hold",
    ),
    (
        "pull_second_person",
        "pull",
        "UPDATE",
        "NEW.confirmed_by = NEW.proposed_by",
        "nobody confirms the own pull",
    ),
    (
        "hold_second_person_at_once",
        "hold",
        "INSERT",
        "NEW.released_by = NEW.held_by",
        "nobody releases the own hold",
    ),
    (
        "pull_second_person_at_once",
        "pull",
        "INSERT",
        "NEW.confirmed_by = NEW.proposed_by",
        "nobody confirms the own pull",
    ),
    # the first person is not exchanged to get round the second
    (
        "hold_first_person",
        "hold",
        "UPDATE",
        "NEW.held_by <> OLD.held_by",
        "who held a thing stays",
    ),
    (
        "pull_first_person",
        "pull",
        "UPDATE",
        "NEW.proposed_by <> OLD.proposed_by",
        "who proposed a pull stays",
    ),
    (
        "lot_maker",
        "lot",
        "UPDATE",
        "NEW.made_by <> OLD.made_by",
        "who made up a lot stays",
    ),
    (
        "sheet_lot",
        "sheet",
        "UPDATE",
        "NEW.lot_id <> OLD.lot_id",
        "a sheet stays with its lot",
    ),
    (
        "certificate_second_signature",
        "certificate",
        "INSERT",
        """
        NOT EXISTS (
            SELECT 1 FROM signature WHERE signature.sheet_id = NEW.sheet_id
            AND signature.evaluation_id = NEW.evaluation_id
            AND signature.meaning = 'countersigned'
        )
        """,
        "a certificate rests on a second signature",
    ),
)


def upgrade():
    op.create_table(
        "counter",
        sa.Column("series", sa.Text(), nullable=False),
        sa.Column("last", sa.Integer(), nullable=False),
        sa.PrimaryKeyConstraint("series", name=op.f("pk_counter")),
    )
    op.create_table(
        "device",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("name", sa.Text(), nullable=False),
        sa.Column("first_seen_at", sa.BigInteger(), nullable=False),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_device")),
    )
    op.create_table(
        "laboratory",
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("name", sa.Text(), nullable=False),
        sa.Column("address", sa.Text(), nullable=False),
        sa.Column("zone", sa.Text(), nullable=False),
        sa.Column("settings", sa.Text(), nullable=False),
        sa.Column("own_signature", sa.Boolean(), nullable=False),
        sa.Column("revision", sa.Integer(), nullable=False),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_laboratory")),
    )
    op.create_table(
        "person",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("sign_in_name", sa.Text(), nullable=False),
        sa.Column("printed_name", sa.Text(), nullable=False),
        sa.Column("initials", sa.Text(), nullable=False),
        sa.Column("password_hash", sa.Text(), nullable=False),
        sa.Column("roles", sa.Text(), nullable=False),
        sa.Column("active", sa.Boolean(), nullable=False),
        sa.Column("made_at", sa.BigInteger(), nullable=False),
        sa.Column("revision", sa.Integer(), nullable=False),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_person")),
        sa.UniqueConstraint("sign_in_name", name=op.f("uq_person_sign_in_name")),
    )
    op.create_table(
        "sign_in_failure",
        sa.Column("key", sa.Text(), nullable=False),
        sa.Column("count", sa.Integer(), nullable=False),
        sa.Column("last_at", sa.BigInteger(), nullable=False),
        sa.PrimaryKeyConstraint("key", name=op.f("pk_sign_in_failure")),
    )
    op.create_table(
        "trail",
        sa.Column("seq", sa.BigInteger(), autoincrement=False, nullable=False),
        sa.Column("at", sa.BigInteger(), nullable=False),
        sa.Column("zone", sa.Text(), nullable=False),
        sa.Column("person_id", sa.String(length=36), nullable=True),
        sa.Column("person_name", sa.Text(), nullable=False),
        sa.Column("act", sa.Text(), nullable=False),
        sa.Column("kind", sa.Text(), nullable=False),
        sa.Column("thing_id", sa.String(length=36), nullable=False),
        sa.Column("thing_name", sa.Text(), nullable=False),
        sa.Column("why", sa.Text(), nullable=True),
        sa.Column("body", sa.Text(), nullable=False),
        sa.Column("previous_hash", sa.Text(), nullable=False),
        sa.Column("hash", sa.Text(), nullable=False),
        sa.PrimaryKeyConstraint("seq", name=op.f("pk_trail")),
        sa.UniqueConstraint("hash", name=op.f("uq_trail_hash")),
    )
    op.create_table(
        "trail_head",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("seq", sa.BigInteger(), nullable=False),
        sa.Column("hash", sa.Text(), nullable=False),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_trail_head")),
    )
    op.create_table(
        "file",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("name", sa.Text(), nullable=False),
        sa.Column("media_type", sa.Text(), nullable=False),
        sa.Column("sha256", sa.Text(), nullable=False),
        sa.Column("content", sa.LargeBinary(), nullable=False),
        sa.Column("made_by", sa.String(length=36), nullable=False),
        sa.Column("made_at", sa.BigInteger(), nullable=False),
        sa.ForeignKeyConstraint(["made_by"], ["person.id"], name=op.f("fk_file_made_by_person")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_file")),
    )
    op.create_table(
        "hold",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("kind", sa.Text(), nullable=False),
        sa.Column("thing_id", sa.String(length=36), nullable=False),
        sa.Column("held_by", sa.String(length=36), nullable=False),
        sa.Column("held_at", sa.BigInteger(), nullable=False),
        sa.Column("reason", sa.Text(), nullable=False),
        sa.Column("released_by", sa.String(length=36), nullable=True),
        sa.Column("released_at", sa.BigInteger(), nullable=True),
        sa.Column("release_reason", sa.Text(), nullable=True),
        sa.ForeignKeyConstraint(["held_by"], ["person.id"], name=op.f("fk_hold_held_by_person")),
        sa.ForeignKeyConstraint(
            ["released_by"], ["person.id"], name=op.f("fk_hold_released_by_person")
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_hold")),
    )
    op.create_index(op.f("ix_hold_thing_id"), "hold", ["thing_id"], unique=False)
    op.create_table(
        "idempotency_key",
        sa.Column("person_id", sa.String(length=36), nullable=False),
        sa.Column("key", sa.Text(), nullable=False),
        sa.Column("body_digest", sa.Text(), nullable=False),
        sa.Column("answer", sa.Text(), nullable=False),
        sa.Column("at", sa.BigInteger(), nullable=False),
        sa.ForeignKeyConstraint(
            ["person_id"], ["person.id"], name=op.f("fk_idempotency_key_person_id_person")
        ),
        sa.PrimaryKeyConstraint("person_id", "key", name=op.f("pk_idempotency_key")),
    )
    op.create_table(
        "instrument",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("kind", sa.Text(), nullable=False),
        sa.Column("name", sa.Text(), nullable=False),
        sa.Column("document", sa.Text(), nullable=False),
        sa.Column("made_by", sa.String(length=36), nullable=False),
        sa.Column("made_at", sa.BigInteger(), nullable=False),
        sa.ForeignKeyConstraint(
            ["made_by"], ["person.id"], name=op.f("fk_instrument_made_by_person")
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_instrument")),
        sa.UniqueConstraint("name", name=op.f("uq_instrument_name")),
    )
    op.create_table(
        "lot",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("code", sa.Text(), nullable=False),
        sa.Column("name", sa.Text(), nullable=False),
        sa.Column("titrant", sa.Text(), nullable=False),
        sa.Column("nominal", sa.Text(), nullable=False),
        sa.Column("medium", sa.Text(), nullable=False),
        sa.Column("document", sa.Text(), nullable=False),
        sa.Column("made_by", sa.String(length=36), nullable=False),
        sa.Column("made_at", sa.BigInteger(), nullable=False),
        sa.ForeignKeyConstraint(["made_by"], ["person.id"], name=op.f("fk_lot_made_by_person")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_lot")),
        sa.UniqueConstraint("code", name=op.f("uq_lot_code")),
        sa.UniqueConstraint("name", name=op.f("uq_lot_name")),
    )
    op.create_table(
        "recipe",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("name", sa.Text(), nullable=False),
        sa.Column("version", sa.Integer(), nullable=False),
        sa.Column("titrant", sa.Text(), nullable=False),
        sa.Column("standard", sa.Text(), nullable=False),
        sa.Column("document", sa.Text(), nullable=False),
        sa.Column("made_by", sa.String(length=36), nullable=False),
        sa.Column("made_at", sa.BigInteger(), nullable=False),
        sa.ForeignKeyConstraint(["made_by"], ["person.id"], name=op.f("fk_recipe_made_by_person")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_recipe")),
        sa.UniqueConstraint("name", "version", name=op.f("uq_recipe_name_version")),
    )
    op.create_table(
        "sign_in",
        sa.Column("token_digest", sa.Text(), nullable=False),
        sa.Column("person_id", sa.String(length=36), nullable=False),
        sa.Column("form_token", sa.Text(), nullable=False),
        sa.Column("began_at", sa.BigInteger(), nullable=False),
        sa.Column("seen_at", sa.BigInteger(), nullable=False),
        sa.Column("ended_at", sa.BigInteger(), nullable=True),
        sa.ForeignKeyConstraint(
            ["person_id"], ["person.id"], name=op.f("fk_sign_in_person_id_person")
        ),
        sa.PrimaryKeyConstraint("token_digest", name=op.f("pk_sign_in")),
    )
    op.create_table(
        "bottle",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("code", sa.Text(), nullable=False),
        sa.Column("lot_id", sa.String(length=36), nullable=False),
        sa.Column("number", sa.Integer(), nullable=False),
        sa.Column("place", sa.Text(), nullable=False),
        sa.Column("volume_mL", sa.Text(), nullable=False),
        sa.Column("filled_by", sa.String(length=36), nullable=False),
        sa.Column("filled_at", sa.BigInteger(), nullable=False),
        sa.Column("used_up_at", sa.BigInteger(), nullable=True),
        sa.Column("used_up_by", sa.String(length=36), nullable=True),
        sa.ForeignKeyConstraint(
            ["filled_by"], ["person.id"], name=op.f("fk_bottle_filled_by_person")
        ),
        sa.ForeignKeyConstraint(["lot_id"], ["lot.id"], name=op.f("fk_bottle_lot_id_lot")),
        sa.ForeignKeyConstraint(
            ["used_up_by"], ["person.id"], name=op.f("fk_bottle_used_up_by_person")
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_bottle")),
        sa.UniqueConstraint("code", name=op.f("uq_bottle_code")),
        sa.UniqueConstraint("lot_id", "number", name=op.f("uq_bottle_lot_id_number")),
    )
    op.create_index(op.f("ix_bottle_lot_id"), "bottle", ["lot_id"], unique=False)
    op.create_table(
        "calibration",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("instrument_id", sa.String(length=36), nullable=False),
        sa.Column("version", sa.Integer(), nullable=False),
        sa.Column("certificate_number", sa.Text(), nullable=False),
        sa.Column("issuer", sa.Text(), nullable=False),
        sa.Column("done_on", sa.Text(), nullable=False),
        sa.Column("due_at", sa.BigInteger(), nullable=False),
        sa.Column("due_basis", sa.Text(), nullable=False),
        sa.Column("document", sa.Text(), nullable=False),
        sa.Column("file_id", sa.String(length=36), nullable=True),
        sa.Column("made_by", sa.String(length=36), nullable=False),
        sa.Column("made_at", sa.BigInteger(), nullable=False),
        sa.ForeignKeyConstraint(["file_id"], ["file.id"], name=op.f("fk_calibration_file_id_file")),
        sa.ForeignKeyConstraint(
            ["instrument_id"],
            ["instrument.id"],
            name=op.f("fk_calibration_instrument_id_instrument"),
        ),
        sa.ForeignKeyConstraint(
            ["made_by"], ["person.id"], name=op.f("fk_calibration_made_by_person")
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_calibration")),
        sa.UniqueConstraint(
            "instrument_id", "version", name=op.f("uq_calibration_instrument_id_version")
        ),
    )
    op.create_index(
        op.f("ix_calibration_instrument_id"), "calibration", ["instrument_id"], unique=False
    )
    op.create_table(
        "pull",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("lot_id", sa.String(length=36), nullable=False),
        sa.Column("reason", sa.Text(), nullable=False),
        sa.Column("proposed_by", sa.String(length=36), nullable=False),
        sa.Column("proposed_at", sa.BigInteger(), nullable=False),
        sa.Column("confirmed_by", sa.String(length=36), nullable=True),
        sa.Column("confirmed_at", sa.BigInteger(), nullable=True),
        sa.ForeignKeyConstraint(
            ["confirmed_by"], ["person.id"], name=op.f("fk_pull_confirmed_by_person")
        ),
        sa.ForeignKeyConstraint(["lot_id"], ["lot.id"], name=op.f("fk_pull_lot_id_lot")),
        sa.ForeignKeyConstraint(
            ["proposed_by"], ["person.id"], name=op.f("fk_pull_proposed_by_person")
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_pull")),
    )
    op.create_index(op.f("ix_pull_lot_id"), "pull", ["lot_id"], unique=False)
    op.create_table(
        "standard_lot",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("name", sa.Text(), nullable=False),
        sa.Column("substance", sa.Text(), nullable=False),
        sa.Column("certificate_number", sa.Text(), nullable=False),
        sa.Column("issuer", sa.Text(), nullable=False),
        sa.Column("due_at", sa.BigInteger(), nullable=False),
        sa.Column("due_basis", sa.Text(), nullable=False),
        sa.Column("document", sa.Text(), nullable=False),
        sa.Column("file_id", sa.String(length=36), nullable=True),
        sa.Column("made_by", sa.String(length=36), nullable=False),
        sa.Column("made_at", sa.BigInteger(), nullable=False),
        sa.ForeignKeyConstraint(
            ["file_id"], ["file.id"], name=op.f("fk_standard_lot_file_id_file")
        ),
        sa.ForeignKeyConstraint(
            ["made_by"], ["person.id"], name=op.f("fk_standard_lot_made_by_person")
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_standard_lot")),
        sa.UniqueConstraint("name", name=op.f("uq_standard_lot_name")),
    )
    op.create_table(
        "sheet",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("number", sa.Text(), nullable=False),
        sa.Column("lot_id", sa.String(length=36), nullable=False),
        sa.Column("recipe_id", sa.String(length=36), nullable=False),
        sa.Column("standard_lot_id", sa.String(length=36), nullable=True),
        sa.Column("calibrations", sa.Text(), nullable=False),
        sa.Column("overrides", sa.Text(), nullable=False),
        sa.Column("begun_by", sa.String(length=36), nullable=False),
        sa.Column("begun_at", sa.BigInteger(), nullable=False),
        sa.Column("handed_in_at", sa.BigInteger(), nullable=True),
        sa.Column("sent_back_at", sa.BigInteger(), nullable=True),
        sa.Column("sent_back_remark", sa.Text(), nullable=True),
        sa.Column("countersigned_at", sa.BigInteger(), nullable=True),
        sa.Column("abandoned_at", sa.BigInteger(), nullable=True),
        sa.Column("evaluation_id", sa.String(length=36), nullable=True),
        sa.Column("revision", sa.Integer(), nullable=False),
        sa.ForeignKeyConstraint(["begun_by"], ["person.id"], name=op.f("fk_sheet_begun_by_person")),
        sa.ForeignKeyConstraint(["lot_id"], ["lot.id"], name=op.f("fk_sheet_lot_id_lot")),
        sa.ForeignKeyConstraint(
            ["recipe_id"], ["recipe.id"], name=op.f("fk_sheet_recipe_id_recipe")
        ),
        sa.ForeignKeyConstraint(
            ["standard_lot_id"],
            ["standard_lot.id"],
            name=op.f("fk_sheet_standard_lot_id_standard_lot"),
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_sheet")),
        sa.UniqueConstraint("number", name=op.f("uq_sheet_number")),
    )
    op.create_index(op.f("ix_sheet_lot_id"), "sheet", ["lot_id"], unique=False)
    op.create_table(
        "entry",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("sheet_id", sa.String(length=36), nullable=False),
        sa.Column("position", sa.Integer(), nullable=False),
        sa.Column("replicate", sa.Integer(), nullable=False),
        sa.Column("slot", sa.Text(), nullable=False),
        sa.Column("segment", sa.Integer(), nullable=False),
        sa.Column("text", sa.Text(), nullable=False),
        sa.Column("unit", sa.Text(), nullable=True),
        sa.Column("raw", sa.Text(), nullable=True),
        sa.Column("strikes", sa.String(length=36), nullable=True),
        sa.Column("reason", sa.Text(), nullable=True),
        sa.Column("person_id", sa.String(length=36), nullable=False),
        sa.Column("posted_by", sa.String(length=36), nullable=False),
        sa.Column("device_id", sa.String(length=36), nullable=True),
        sa.Column("device_sequence", sa.Integer(), nullable=True),
        sa.Column("device_at", sa.BigInteger(), nullable=True),
        sa.Column("device_zone", sa.Text(), nullable=True),
        sa.Column("monotonic_ms", sa.BigInteger(), nullable=True),
        sa.Column("received_at", sa.BigInteger(), nullable=False),
        sa.Column("base_revision", sa.Integer(), nullable=True),
        sa.Column("body_digest", sa.Text(), nullable=False),
        sa.Column("late", sa.Boolean(), nullable=False),
        sa.ForeignKeyConstraint(
            ["device_id"], ["device.id"], name=op.f("fk_entry_device_id_device")
        ),
        sa.ForeignKeyConstraint(
            ["person_id"], ["person.id"], name=op.f("fk_entry_person_id_person")
        ),
        sa.ForeignKeyConstraint(
            ["posted_by"], ["person.id"], name=op.f("fk_entry_posted_by_person")
        ),
        sa.ForeignKeyConstraint(["sheet_id"], ["sheet.id"], name=op.f("fk_entry_sheet_id_sheet")),
        sa.ForeignKeyConstraint(["strikes"], ["entry.id"], name=op.f("fk_entry_strikes_entry")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_entry")),
        sa.UniqueConstraint("sheet_id", "position", name=op.f("uq_entry_sheet_id_position")),
    )
    op.create_index(op.f("ix_entry_sheet_id"), "entry", ["sheet_id"], unique=False)
    op.create_index(
        "uq_entry_device_id_device_sequence",
        "entry",
        ["device_id", "device_sequence"],
        unique=True,
        sqlite_where=sa.text("device_id IS NOT NULL"),
        postgresql_where=sa.text("device_id IS NOT NULL"),
    )
    op.create_table(
        "evaluation",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("sheet_id", sa.String(length=36), nullable=False),
        sa.Column("calculation", sa.Text(), nullable=False),
        sa.Column("input_digest", sa.Text(), nullable=False),
        sa.Column("snapshot", sa.Text(), nullable=False),
        sa.Column("snapshot_digest", sa.Text(), nullable=False),
        sa.Column("made_at", sa.BigInteger(), nullable=False),
        sa.ForeignKeyConstraint(
            ["sheet_id"], ["sheet.id"], name=op.f("fk_evaluation_sheet_id_sheet")
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_evaluation")),
    )
    op.create_index(op.f("ix_evaluation_sheet_id"), "evaluation", ["sheet_id"], unique=False)
    op.create_table(
        "certificate",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("number", sa.Text(), nullable=False),
        sa.Column("lot_id", sa.String(length=36), nullable=False),
        sa.Column("sheet_id", sa.String(length=36), nullable=False),
        sa.Column("evaluation_id", sa.String(length=36), nullable=False),
        sa.Column("replaces_id", sa.String(length=36), nullable=True),
        sa.Column("issued_at", sa.BigInteger(), nullable=False),
        sa.Column("valid_until", sa.BigInteger(), nullable=False),
        sa.Column("document", sa.Text(), nullable=False),
        sa.Column("document_digest", sa.Text(), nullable=False),
        sa.Column("trail_seq", sa.Integer(), nullable=False),
        sa.Column("trail_hash", sa.Text(), nullable=False),
        sa.ForeignKeyConstraint(
            ["evaluation_id"],
            ["evaluation.id"],
            name=op.f("fk_certificate_evaluation_id_evaluation"),
        ),
        sa.ForeignKeyConstraint(["lot_id"], ["lot.id"], name=op.f("fk_certificate_lot_id_lot")),
        sa.ForeignKeyConstraint(
            ["replaces_id"], ["certificate.id"], name=op.f("fk_certificate_replaces_id_certificate")
        ),
        sa.ForeignKeyConstraint(
            ["sheet_id"], ["sheet.id"], name=op.f("fk_certificate_sheet_id_sheet")
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_certificate")),
        sa.UniqueConstraint("number", name=op.f("uq_certificate_number")),
        sa.UniqueConstraint("replaces_id", name=op.f("uq_certificate_replaces_id")),
    )
    op.create_index(op.f("ix_certificate_lot_id"), "certificate", ["lot_id"], unique=False)
    op.create_table(
        "signature",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("sheet_id", sa.String(length=36), nullable=False),
        sa.Column("person_id", sa.String(length=36), nullable=False),
        sa.Column("printed_name", sa.Text(), nullable=False),
        sa.Column("meaning", sa.Text(), nullable=False),
        sa.Column("at", sa.BigInteger(), nullable=False),
        sa.Column("zone", sa.Text(), nullable=False),
        sa.Column("evaluation_id", sa.String(length=36), nullable=False),
        sa.Column("signed_digest", sa.Text(), nullable=False),
        sa.Column("reasons", sa.Text(), nullable=False),
        sa.Column("remark", sa.Text(), nullable=True),
        sa.ForeignKeyConstraint(
            ["evaluation_id"], ["evaluation.id"], name=op.f("fk_signature_evaluation_id_evaluation")
        ),
        sa.ForeignKeyConstraint(
            ["person_id"], ["person.id"], name=op.f("fk_signature_person_id_person")
        ),
        sa.ForeignKeyConstraint(
            ["sheet_id"], ["sheet.id"], name=op.f("fk_signature_sheet_id_sheet")
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_signature")),
    )
    op.create_index(op.f("ix_signature_sheet_id"), "signature", ["sheet_id"], unique=False)
    op.execute(f"INSERT INTO trail_head (id, seq, hash) VALUES (1, 0, '{GENESIS}')")
    if op.get_bind().dialect.name == "postgresql":
        _triggers_of_postgresql()
    else:
        _triggers_of_sqlite()


def _refusals():
    """Return (trigger, table, event, condition or None, words) of all triggers."""
    refused = [
        (f"{table}_no_{event.lower()}", table, event, None, f"{table} is in ink: no {event}")
        for table in INK
        for event in ("UPDATE", "DELETE")
    ]
    refused += [
        (f"{table}_no_delete", table, "DELETE", None, f"{table} is kept: no DELETE")
        for table in (*KEPT, "trail_head")
    ]
    return [*refused, *RULES]


def _triggers_of_sqlite():
    for name, table, event, condition, words in _refusals():
        when = f"WHEN {condition}" if condition else ""
        op.execute(
            f"CREATE TRIGGER {name} BEFORE {event} ON {table} FOR EACH ROW {when} "
            f"BEGIN SELECT RAISE(ABORT, '{words}'); END"
        )
    for table in (*INK, *KEPT, "trail_head"):
        _no_replacing(table)


def _no_replacing(table):
    """Refuse INSERT OR REPLACE and UPDATE OR REPLACE: they delete rows past the DELETE triggers."""
    connection = op.get_bind()
    columns = connection.exec_driver_sql(f"PRAGMA table_info({table})").fetchall()
    keys = {tuple(row[1] for row in sorted(columns, key=lambda row: row[5]) if row[5])}
    for index in connection.exec_driver_sql(f"PRAGMA index_list({table})").fetchall():
        if index[2]:
            parts = connection.exec_driver_sql(f"PRAGMA index_info({index[1]})").fetchall()
            keys.add(tuple(row[2] for row in parts))
    same = " OR ".join(
        "(" + " AND ".join(f'"{name}" = NEW."{name}"' for name in key) + ")" for key in sorted(keys)
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
    op.execute(
        "CREATE FUNCTION refuse_truncate() RETURNS trigger LANGUAGE plpgsql AS $$ "
        "BEGIN RAISE EXCEPTION 'kept: no TRUNCATE'; END $$"
    )
    for table in (*INK, *KEPT, "trail_head"):
        op.execute(
            f"CREATE TRIGGER {table}_no_truncate BEFORE TRUNCATE ON {table} "
            "FOR EACH STATEMENT EXECUTE FUNCTION refuse_truncate()"
        )
