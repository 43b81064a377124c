"""What an edition took of its upload, and what it changed."""

import sqlalchemy as sa
from alembic import op

revision = "c41e7a90d5b2"
down_revision = "b7d5af30aa27"


def upgrade() -> None:
    op.add_column("edition", sa.Column("taking", sa.Text(), server_default="", nullable=False))
    op.add_column("edition", sa.Column("effect", sa.Text(), server_default="", nullable=False))
