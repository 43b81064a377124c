"""Cause lists of editions, their labels and order."""

import sqlalchemy as sa
from alembic import op

revision = "f3a90c57be18"
down_revision = "e2b86f14c7d9"


def upgrade() -> None:
    op.create_table(
        "cause",
        sa.Column("code", sa.String(length=32), nullable=False),
        sa.Column("parent", sa.String(length=32), nullable=False),
        sa.Column("ranges", sa.Text(), nullable=False),
        sa.Column("kind", sa.String(length=16), nullable=False),
        sa.Column("care", sa.String(length=16), nullable=False),
        sa.Column("sex", sa.String(length=1), nullable=False),
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("collection_id", sa.Integer(), nullable=False),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.Column("first", sa.Integer(), nullable=False),
        sa.Column("until", sa.Integer(), nullable=True),
        sa.CheckConstraint("until IS NULL OR until > first", name=op.f("ck_cause_range")),
        sa.CheckConstraint(
            "kind IN ('natural', 'external', 'undetermined', 'ill_defined', 'pending',"
            " 'not_underlying')",
            name=op.f("ck_cause_kind"),
        ),
        sa.ForeignKeyConstraint(
            ["collection_id"], ["collection.id"], name=op.f("fk_cause_collection_id_collection")
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_cause")),
        sqlite_strict=True,
    )
    op.create_index(
        "ix_cause_by_key", "cause", ["collection_id", "code", "first", "until"], unique=False
    )
    op.create_index(
        "uq_cause_holding",
        "cause",
        ["collection_id", "code"],
        unique=True,
        sqlite_where=sa.text("until IS NULL"),
        postgresql_where=sa.text("until IS NULL"),
    )
    op.create_table(
        "cause_label",
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("collection_id", sa.Integer(), nullable=False),
        sa.Column("code", sa.String(length=32), nullable=False),
        sa.Column("label", sa.String(), nullable=False),
        sa.Column("place", sa.Integer(), nullable=False),
        sa.ForeignKeyConstraint(
            ["collection_id"],
            ["collection.id"],
            name=op.f("fk_cause_label_collection_id_collection"),
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_cause_label")),
        sa.UniqueConstraint("collection_id", "code", name=op.f("uq_cause_label_collection_id")),
        sqlite_strict=True,
    )
