"""What all tables share: the metadata with named constraints, and the column spellings."""

from datetime import datetime
from typing import Annotated, Any

from sqlalchemy import MetaData, String
from sqlalchemy.orm import DeclarativeBase, mapped_column

from server.records.columns import Instant, JsonText

Uuid = Annotated[str, mapped_column(String(36))]
When = Annotated[datetime, mapped_column(Instant)]
Document = Annotated[Any, mapped_column(JsonText)]


class Table(DeclarativeBase):
    """The base of every table."""

    metadata = MetaData(
        naming_convention={
            "ix": "ix_%(column_0_label)s",
            "uq": "uq_%(table_name)s_%(column_0_N_name)s",
            "ck": "ck_%(table_name)s_%(constraint_name)s",
            "fk": "fk_%(table_name)s_%(column_0_N_name)s_%(referred_table_name)s",
            "pk": "pk_%(table_name)s",
        }
    )
