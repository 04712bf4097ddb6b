"""Partners: which wells, columns and units each is entitled to.

Revision ID: 0003
Revises: 0002
Create Date: 2026-12-01
"""

from __future__ import annotations

import sqlalchemy as sa
from alembic import op

revision = "0003"
down_revision = "0002"
branch_labels = None
depends_on = None


def upgrade() -> None:
    op.create_table(
        "partner",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("event", sa.Integer(), nullable=False),
        sa.Column("name", sa.Text(), nullable=False),
        sa.Column("wells", sa.Text(), nullable=False),
        sa.Column("columns", sa.Text(), nullable=False),
        sa.Column("units", sa.Text(), nullable=False),
        sa.Column("digest", sa.Text(), nullable=False),
        sa.CheckConstraint("length(digest) = 64", name=op.f("ck_partner_digest")),
        sa.CheckConstraint("length(name) > 0", name=op.f("ck_partner_name")),
        sa.ForeignKeyConstraint(
            ["event"], ["event.number"], name=op.f("fk_partner_event"), initially="DEFERRED", deferrable=True
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_partner")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_partner_event"), "partner", ["event"], unique=False)


def downgrade() -> None:
    raise RuntimeError("a record of readings is never downgraded: restore the backup made before the upgrade")
