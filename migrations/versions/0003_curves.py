"""The original behind an entry, and the columns of a curve's table as an instrument writes them."""

import sqlalchemy as sa
from alembic import op

revision = "0003"
down_revision = "0002"
branch_labels = None
depends_on = None


def upgrade():
    # a batch rebuild would lose the triggers that keep entries in ink
    op.execute(
        "ALTER TABLE entry ADD COLUMN file_id VARCHAR(36) "
        "CONSTRAINT fk_entry_file_id_file REFERENCES file (id)"
    )
    op.create_table(
        "curve_columns",
        sa.Column("instrument_id", sa.String(length=36), nullable=False),
        sa.Column("document", sa.Text(), nullable=False),
        sa.Column("person_id", sa.String(length=36), nullable=False),
        sa.Column("at", sa.BigInteger(), nullable=False),
        sa.ForeignKeyConstraint(
            ["instrument_id"],
            ["instrument.id"],
            name="fk_curve_columns_instrument_id_instrument",
        ),
        sa.ForeignKeyConstraint(
            ["person_id"], ["person.id"], name="fk_curve_columns_person_id_person"
        ),
        sa.PrimaryKeyConstraint("instrument_id", name="pk_curve_columns"),
    )
