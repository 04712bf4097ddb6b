"""Other laboratories' results: their files, plugs and results, kept apart from the lab's own.

Revision ID: 0005
Revises: 0004
Create Date: 2026-12-01
"""

from __future__ import annotations

import sqlalchemy as sa
from alembic import op

revision = "0005"
down_revision = "0004"
branch_labels = None
depends_on = None


Real = sa.Double().with_variant(sa.REAL(), "sqlite")


def upgrade() -> None:
    op.create_table(
        "other_file",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("event", sa.Integer(), nullable=False),
        sa.Column("well_id", sa.Integer(), nullable=False),
        sa.Column("state", sa.Text(), nullable=False),
        sa.Column("supersedes", sa.Integer(), nullable=True),
        sa.Column("file", sa.Text(), nullable=False),
        sa.Column("heading", sa.Text(), nullable=False),
        sa.Column("notices", sa.Text(), nullable=False),
        sa.Column("content", sa.LargeBinary(), nullable=False),
        sa.Column("content_digest", sa.Text(), nullable=False),
        sa.Column("digest", sa.Text(), nullable=False),
        sa.CheckConstraint("state = 'read' OR supersedes IS NOT NULL", name=op.f("ck_other_file_withdrawn")),
        sa.CheckConstraint("state IN ('read', 'withdrawn')", name=op.f("ck_other_file_state")),
        sa.CheckConstraint("length(content_digest) = 64", name=op.f("ck_other_file_content_digest")),
        sa.CheckConstraint("length(digest) = 64", name=op.f("ck_other_file_digest")),
        sa.CheckConstraint("supersedes IS NULL OR supersedes < id", name=op.f("ck_other_file_supersedes")),
        sa.ForeignKeyConstraint(
            ["event"],
            ["event.number"],
            name=op.f("fk_other_file_event"),
            initially="DEFERRED",
            deferrable=True,
        ),
        sa.ForeignKeyConstraint(["supersedes"], ["other_file.id"], name=op.f("fk_other_file_supersedes")),
        sa.ForeignKeyConstraint(["well_id"], ["well.id"], name=op.f("fk_other_file_well_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_other_file")),
        sa.UniqueConstraint("supersedes", name=op.f("uq_other_file_supersedes")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_other_file_event"), "other_file", ["event"], unique=False)
    op.create_index(op.f("ix_other_file_well_id"), "other_file", ["well_id"], unique=False)
    op.create_table(
        "other_plug",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("event", sa.Integer(), nullable=False),
        sa.Column("other_file_id", sa.Integer(), nullable=False),
        sa.Column("laboratory", sa.Text(), nullable=False),
        sa.Column("name", sa.Text(), nullable=False),
        sa.Column("name_key", sa.Text(), nullable=False),
        sa.Column("sample", sa.Text(), nullable=False),
        sa.Column("depth_m", Real, nullable=True),
        sa.Column("depth_basis", sa.Text(), nullable=False),
        sa.Column("source", sa.Text(), nullable=False),
        sa.Column("orientation", sa.Text(), nullable=False),
        sa.Column("facies", sa.Text(), nullable=False),
        sa.Column("lithology", sa.Text(), nullable=False),
        sa.Column("description", sa.Text(), nullable=False),
        sa.Column("flags", sa.Text(), nullable=False),
        sa.Column("row", sa.Integer(), nullable=False),
        sa.Column("entered", sa.Text(), nullable=False),
        sa.Column("digest", sa.Text(), nullable=False),
        sa.CheckConstraint("depth_basis IN ('driller', 'log')", name=op.f("ck_other_plug_depth_basis")),
        sa.CheckConstraint(
            "orientation IN ('', 'horizontal', 'vertical', 'oblique')", name=op.f("ck_other_plug_orientation")
        ),
        sa.CheckConstraint("depth_m >= -1e+300 AND depth_m <= 1e+300", name=op.f("ck_other_plug_depth_m")),
        sa.CheckConstraint("length(digest) = 64", name=op.f("ck_other_plug_digest")),
        sa.CheckConstraint("length(laboratory) > 0", name=op.f("ck_other_plug_laboratory")),
        sa.CheckConstraint("length(name) > 0", name=op.f("ck_other_plug_name")),
        sa.ForeignKeyConstraint(
            ["event"],
            ["event.number"],
            name=op.f("fk_other_plug_event"),
            initially="DEFERRED",
            deferrable=True,
        ),
        sa.ForeignKeyConstraint(
            ["other_file_id"], ["other_file.id"], name=op.f("fk_other_plug_other_file_id")
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_other_plug")),
        sa.UniqueConstraint(
            "other_file_id",
            "laboratory",
            "name_key",
            name=op.f("uq_other_plug_other_file_id_laboratory_name_key"),
        ),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_other_plug_event"), "other_plug", ["event"], unique=False)
    op.create_table(
        "other_result",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("event", sa.Integer(), nullable=False),
        sa.Column("other_plug_id", sa.Integer(), nullable=False),
        sa.Column("quantity", sa.Text(), nullable=False),
        sa.Column("direction", sa.Text(), nullable=False),
        sa.Column("basis", sa.Text(), nullable=False),
        sa.Column("stress_mpa", Real, nullable=True),
        sa.Column("value", Real, nullable=True),
        sa.Column("value_limit", sa.Text(), nullable=True),
        sa.Column("flags", sa.Text(), nullable=False),
        sa.Column("reason", sa.Text(), nullable=False),
        sa.Column("digest", sa.Text(), nullable=False),
        sa.CheckConstraint("value_limit IN ('below', 'above')", name=op.f("ck_other_result_value_limit")),
        sa.CheckConstraint("(value IS NOT NULL) <> (length(reason) > 0)", name=op.f("ck_other_result_value")),
        sa.CheckConstraint("length(digest) = 64", name=op.f("ck_other_result_digest")),
        sa.CheckConstraint(
            "stress_mpa >= 0.0 AND stress_mpa <= 1e+300", name=op.f("ck_other_result_stress_mpa")
        ),
        sa.CheckConstraint("value >= -1e+300 AND value <= 1e+300", name=op.f("ck_other_result_size")),
        sa.ForeignKeyConstraint(
            ["event"],
            ["event.number"],
            name=op.f("fk_other_result_event"),
            initially="DEFERRED",
            deferrable=True,
        ),
        sa.ForeignKeyConstraint(
            ["other_plug_id"], ["other_plug.id"], name=op.f("fk_other_result_other_plug_id")
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_other_result")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_other_result_event"), "other_result", ["event"], unique=False)
    op.create_index(op.f("ix_other_result_other_plug_id"), "other_result", ["other_plug_id"], unique=False)


def downgrade() -> None:
    raise RuntimeError("a record of readings is never downgraded: restore the backup made before the upgrade")
