"""Breaks, policies, masks, statements of quality; estimates, vintages and erased files marked."""

import sqlalchemy as sa
from alembic import op

revision = "b7d5af30aa27"
down_revision = "4ca330161ef1"


def upgrade() -> None:
    op.create_table(
        "break",
        sa.Column("area", sa.String(length=32), nullable=False),
        sa.Column("period", sa.String(length=32), nullable=False),
        sa.Column("kind", sa.String(length=16), nullable=False),
        sa.Column("cause", sa.String(length=32), nullable=False),
        sa.Column("note", sa.Text(), nullable=False),
        sa.Column("ratio", sa.Double(), nullable=True),
        sa.Column("ratio_error", sa.Double(), nullable=True),
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("collection_id", sa.Integer(), nullable=False),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.Column("first", sa.Integer(), nullable=False),
        sa.Column("until", sa.Integer(), nullable=True),
        sa.CheckConstraint(
            "kind IN ('boundary', 'coding', 'definition', 'population', 'shock')",
            name=op.f("ck_break_kind"),
        ),
        sa.CheckConstraint("until IS NULL OR until > first", name=op.f("ck_break_range")),
        sa.ForeignKeyConstraint(
            ["collection_id"], ["collection.id"], name=op.f("fk_break_collection_id_collection")
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_break")),
        sqlite_strict=True,
    )
    op.create_index(
        "ix_break_by_key",
        "break",
        ["collection_id", "area", "period", "kind", "cause", "first", "until"],
        unique=False,
    )
    op.create_index(
        "uq_break_holding",
        "break",
        ["collection_id", "area", "period", "kind", "cause"],
        unique=True,
        sqlite_where=sa.text("until IS NULL"),
        postgresql_where=sa.text("until IS NULL"),
    )

    op.create_table(
        "policy",
        sa.Column("collection_id", sa.Integer(), nullable=False),
        sa.Column("number", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("terms", sa.Text(), nullable=False),
        sa.Column("made", sa.DateTime(timezone=True), nullable=False),
        sa.Column("by", sa.String(), nullable=False),
        sa.Column("note", sa.Text(), nullable=False),
        sa.ForeignKeyConstraint(
            ["collection_id"], ["collection.id"], name=op.f("fk_policy_collection_id_collection")
        ),
        sa.PrimaryKeyConstraint("collection_id", "number", name=op.f("pk_policy")),
        sqlite_strict=True,
    )
    op.create_table(
        "mask",
        sa.Column("collection_id", sa.Integer(), nullable=False),
        sa.Column("edition", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("policy", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("digest", sa.String(length=64), nullable=False),
        sa.Column("content", sa.LargeBinary(), nullable=False),
        sa.Column("made", sa.DateTime(timezone=True), nullable=False),
        sa.ForeignKeyConstraint(
            ["collection_id", "edition"],
            ["edition.collection_id", "edition.number"],
            name=op.f("fk_mask_collection_id_edition"),
        ),
        sa.ForeignKeyConstraint(
            ["collection_id", "policy"],
            ["policy.collection_id", "policy.number"],
            name=op.f("fk_mask_collection_id_policy"),
        ),
        sa.PrimaryKeyConstraint("collection_id", "edition", "policy", name=op.f("pk_mask")),
        sqlite_strict=True,
    )
    op.create_table(
        "statement",
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("collection_id", sa.Integer(), nullable=False),
        sa.Column("edition", sa.Integer(), nullable=False),
        sa.Column("at", sa.DateTime(timezone=True), nullable=False),
        sa.Column("by", sa.String(), nullable=False),
        sa.Column("answers", sa.Text(), nullable=False),
        sa.ForeignKeyConstraint(
            ["collection_id", "edition"],
            ["edition.collection_id", "edition.number"],
            name=op.f("fk_statement_collection_id_edition"),
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_statement")),
        sqlite_strict=True,
    )
    op.create_index(
        "ix_statement_of_edition", "statement", ["collection_id", "edition", "id"], unique=False
    )

    op.add_column("basis", sa.Column("vintage", sa.String(), server_default="", nullable=False))

    op.add_column(
        "schedule", sa.Column("estimated", sa.Boolean(), server_default=sa.false(), nullable=False)
    )

    op.add_column("upload_file", sa.Column("erased", sa.DateTime(timezone=True), nullable=True))
    op.add_column(
        "upload_file", sa.Column("erased_by", sa.String(), server_default="", nullable=False)
    )
    op.add_column(
        "upload_file", sa.Column("erased_why", sa.Text(), server_default="", nullable=False)
    )
