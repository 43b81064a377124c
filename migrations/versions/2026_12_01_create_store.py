"""The first tables: collections, uploads, editions and their content, jobs."""

import sqlalchemy as sa
from alembic import op

revision = "4ca330161ef1"
down_revision = None


def upgrade() -> None:
    op.create_table(
        "collection",
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("code", sa.String(length=32), nullable=False),
        sa.Column("name", sa.String(), nullable=False),
        sa.Column("owner", sa.String(), nullable=False),
        sa.Column("revision", sa.Integer(), nullable=False),
        sa.Column("made", sa.DateTime(timezone=True), nullable=False),
        sa.PrimaryKeyConstraint("id", name="pk_collection"),
        sa.UniqueConstraint("code", name="uq_collection_code"),
        sqlite_strict=True,
    )
    op.create_table(
        "grid",
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("starts", sa.Text(), nullable=False),
        sa.PrimaryKeyConstraint("id", name="pk_grid"),
        sa.UniqueConstraint("starts", name="uq_grid_starts"),
        sqlite_strict=True,
    )
    op.create_table(
        "job",
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("kind", sa.String(), nullable=False),
        sa.Column("params", sa.Text(), nullable=False),
        sa.Column("digest", sa.String(length=64), nullable=False),
        sa.Column("state", sa.String(), nullable=False),
        sa.Column("done", sa.Integer(), nullable=False),
        sa.Column("total", sa.Integer(), nullable=False),
        sa.Column("message", sa.Text(), nullable=False),
        sa.Column("attempt", sa.Integer(), nullable=False),
        sa.Column("beat", sa.Integer(), nullable=False),
        sa.Column("queued", sa.DateTime(timezone=True), nullable=False),
        sa.Column("started", sa.DateTime(timezone=True), nullable=True),
        sa.Column("ended", sa.DateTime(timezone=True), nullable=True),
        sa.CheckConstraint(
            "state IN ('queued', 'running', 'done', 'failed', 'cancelled')",
            name=op.f("ck_job_state"),
        ),
        sa.PrimaryKeyConstraint("id", name="pk_job"),
        sqlite_autoincrement=True,
        sqlite_strict=True,
    )
    op.create_index("ix_job_by_state", "job", ["state", "id"])

    op.create_table(
        "area",
        sa.Column("code", sa.String(length=32), nullable=False),
        sa.Column("parent", sa.String(length=32), nullable=False),
        sa.Column("delivered", sa.Boolean(), nullable=False),
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("collection_id", sa.Integer(), nullable=False),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.Column("first", sa.Integer(), nullable=False),
        sa.Column("until", sa.Integer(), nullable=True),
        sa.CheckConstraint("until IS NULL OR until > first", name=op.f("ck_area_range")),
        sa.ForeignKeyConstraint(
            ["collection_id"], ["collection.id"], name="fk_area_collection_id_collection"
        ),
        sa.PrimaryKeyConstraint("id", name="pk_area"),
        sqlite_strict=True,
    )
    op.create_index("ix_area_by_key", "area", ["collection_id", "code", "first", "until"])
    op.create_index(
        "uq_area_holding",
        "area",
        ["collection_id", "code"],
        unique=True,
        sqlite_where=sa.text("until IS NULL"),
        postgresql_where=sa.text("until IS NULL"),
    )

    op.create_table(
        "area_name",
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("collection_id", sa.Integer(), nullable=False),
        sa.Column("code", sa.String(length=32), nullable=False),
        sa.Column("name", sa.String(), nullable=False),
        sa.ForeignKeyConstraint(
            ["collection_id"], ["collection.id"], name="fk_area_name_collection_id_collection"
        ),
        sa.PrimaryKeyConstraint("id", name="pk_area_name"),
        sa.UniqueConstraint("collection_id", "code", name="uq_area_name_collection_id"),
        sqlite_strict=True,
    )
    op.create_table(
        "basis",
        sa.Column("people", sa.String(), nullable=False),
        sa.Column("dated_by", sa.String(), nullable=False),
        sa.Column("population", sa.String(), nullable=False),
        sa.Column("population_date", sa.String(), nullable=False),
        sa.Column("source", sa.String(), nullable=False),
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("collection_id", sa.Integer(), nullable=False),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.Column("first", sa.Integer(), nullable=False),
        sa.Column("until", sa.Integer(), nullable=True),
        sa.CheckConstraint("until IS NULL OR until > first", name=op.f("ck_basis_range")),
        sa.ForeignKeyConstraint(
            ["collection_id"], ["collection.id"], name="fk_basis_collection_id_collection"
        ),
        sa.PrimaryKeyConstraint("id", name="pk_basis"),
        sqlite_strict=True,
    )
    op.create_index("ix_basis_by_key", "basis", ["collection_id", "first", "until"])
    op.create_index(
        "uq_basis_holding",
        "basis",
        ["collection_id"],
        unique=True,
        sqlite_where=sa.text("until IS NULL"),
        postgresql_where=sa.text("until IS NULL"),
    )

    op.create_table(
        "schedule",
        sa.Column("area", sa.String(length=32), nullable=False),
        sa.Column("sex", sa.String(length=1), nullable=False),
        sa.Column("period", sa.String(length=32), nullable=False),
        sa.Column("period_start", sa.Date(), nullable=False),
        sa.Column("measure", sa.String(length=32), nullable=False),
        sa.Column("cause", sa.String(length=32), nullable=False),
        sa.Column("status", sa.String(length=16), nullable=False),
        sa.Column("grid_id", sa.Integer(), nullable=False),
        sa.Column("vector", sa.LargeBinary(), nullable=False),
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("collection_id", sa.Integer(), nullable=False),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.Column("first", sa.Integer(), nullable=False),
        sa.Column("until", sa.Integer(), nullable=True),
        sa.CheckConstraint("sex IN ('f', 'm', 'p')", name=op.f("ck_schedule_sex")),
        sa.CheckConstraint("status IN ('final', 'provisional')", name=op.f("ck_schedule_status")),
        sa.CheckConstraint(
            "length(vector) % 8 = 0", name=op.f("ck_schedule_whole_numbers_of_8_bytes")
        ),
        sa.CheckConstraint("until IS NULL OR until > first", name=op.f("ck_schedule_range")),
        sa.ForeignKeyConstraint(
            ["collection_id"], ["collection.id"], name="fk_schedule_collection_id_collection"
        ),
        sa.ForeignKeyConstraint(["grid_id"], ["grid.id"], name="fk_schedule_grid_id_grid"),
        sa.PrimaryKeyConstraint("id", name="pk_schedule"),
        sqlite_strict=True,
    )
    op.create_index(
        "ix_schedule_by_key",
        "schedule",
        ["collection_id", "area", "sex", "period", "measure", "cause", "first", "until"],
        unique=False,
    )
    op.create_index(
        "uq_schedule_holding",
        "schedule",
        ["collection_id", "area", "sex", "period", "measure", "cause"],
        unique=True,
        sqlite_where=sa.text("until IS NULL"),
        postgresql_where=sa.text("until IS NULL"),
    )

    op.create_table(
        "upload",
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("collection_id", sa.Integer(), nullable=False),
        sa.Column("received", sa.DateTime(timezone=True), nullable=False),
        sa.Column("by", sa.String(), nullable=False),
        sa.Column("basis", sa.Text(), nullable=True),
        sa.Column("reader", sa.String(), nullable=False),
        sa.Column("report", sa.Text(), nullable=False),
        sa.Column("base", sa.Integer(), nullable=True),
        sa.ForeignKeyConstraint(
            ["collection_id"], ["collection.id"], name="fk_upload_collection_id_collection"
        ),
        sa.PrimaryKeyConstraint("id", name="pk_upload"),
        sqlite_autoincrement=True,
        sqlite_strict=True,
    )
    op.create_index("ix_upload_collection_id", "upload", ["collection_id"])

    op.create_table(
        "edition",
        sa.Column("collection_id", sa.Integer(), nullable=False),
        sa.Column("number", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("base", sa.Integer(), nullable=False),
        sa.Column("replaces", sa.Boolean(), nullable=False),
        sa.Column("made", sa.DateTime(timezone=True), nullable=False),
        sa.Column("by", sa.String(), nullable=False),
        sa.Column("note", sa.Text(), nullable=False),
        sa.Column("digest", sa.String(length=64), nullable=False),
        sa.Column("upload_id", sa.Integer(), nullable=True),
        sa.CheckConstraint("number > base", name=op.f("ck_edition_follows_its_base")),
        sa.ForeignKeyConstraint(
            ["collection_id"], ["collection.id"], name="fk_edition_collection_id_collection"
        ),
        sa.ForeignKeyConstraint(["upload_id"], ["upload.id"], name="fk_edition_upload_id_upload"),
        sa.PrimaryKeyConstraint("collection_id", "number", name="pk_edition"),
        sa.UniqueConstraint("upload_id", name="uq_edition_upload_id"),
        sqlite_strict=True,
    )
    op.create_table(
        "upload_file",
        sa.Column("upload_id", sa.Integer(), nullable=False),
        sa.Column("role", sa.String(), nullable=False),
        sa.Column("name", sa.String(), nullable=False),
        sa.Column("size", sa.Integer(), nullable=False),
        sa.Column("sha256", sa.String(length=64), nullable=False),
        sa.Column("mapping", sa.Text(), nullable=False),
        sa.Column("content", sa.LargeBinary(), nullable=False),
        sa.ForeignKeyConstraint(
            ["upload_id"], ["upload.id"], name="fk_upload_file_upload_id_upload", ondelete="CASCADE"
        ),
        sa.PrimaryKeyConstraint("upload_id", "role", name="pk_upload_file"),
        sqlite_strict=True,
    )
    op.create_table(
        "edition_event",
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("collection_id", sa.Integer(), nullable=False),
        sa.Column("number", sa.Integer(), nullable=False),
        sa.Column("what", sa.String(), nullable=False),
        sa.Column("at", sa.DateTime(timezone=True), nullable=False),
        sa.Column("by", sa.String(), nullable=False),
        sa.Column("note", sa.Text(), nullable=False),
        sa.CheckConstraint(
            "what IN ('withdrawn', 'reinstated')", name=op.f("ck_edition_event_what")
        ),
        sa.ForeignKeyConstraint(
            ["collection_id", "number"],
            ["edition.collection_id", "edition.number"],
            name="fk_edition_event_collection_id_edition",
        ),
        sa.PrimaryKeyConstraint("id", name="pk_edition_event"),
        sqlite_strict=True,
    )
    op.create_index(
        "ix_edition_event_of_edition",
        "edition_event",
        ["collection_id", "number", "id"],
        unique=False,
    )
