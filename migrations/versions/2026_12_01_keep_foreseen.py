"""What an edition made of a draft would change, kept beside its report."""

import sqlalchemy as sa
from alembic import op

revision = "e2b86f14c7d9"
down_revision = "c41e7a90d5b2"


def upgrade() -> None:
    op.create_table(
        "foreseen",
        sa.Column("upload_id", sa.Integer(), nullable=False),
        sa.Column("taking", sa.Text(), nullable=False),
        sa.Column("base", sa.Integer(), nullable=False),
        sa.Column("content", sa.Text(), nullable=False),
        sa.ForeignKeyConstraint(
            ["upload_id"],
            ["upload.id"],
            name=op.f("fk_foreseen_upload_id_upload"),
            ondelete="CASCADE",
        ),
        sa.PrimaryKeyConstraint("upload_id", "taking", name=op.f("pk_foreseen")),
        sqlite_strict=True,
    )
