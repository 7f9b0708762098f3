"""The tables of the store. Times are seconds since 1970-01-01 UTC."""

from sqlalchemy import Column, Float, LargeBinary, MetaData, String, Table

SCHEMA_VERSION = "1"

metadata = MetaData()

about = Table(
    "about",
    metadata,
    Column("name", String(64), primary_key=True),
    Column("value", String(256), nullable=False),
)
systems = Table(
    "systems",
    metadata,
    Column("id", String(64), primary_key=True),
    Column("content", LargeBinary, nullable=False),
    Column("stored", Float, nullable=False),
)
answers = Table(
    "answers",
    metadata,
    Column("id", String(64), primary_key=True),
    Column("task", String(64), nullable=False),
    Column("system_id", String(64), nullable=False),
    Column("body", LargeBinary, nullable=False),
    Column("stored", Float, nullable=False),
)
