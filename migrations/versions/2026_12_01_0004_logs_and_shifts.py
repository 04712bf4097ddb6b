"""Logs that were read in, and the depth shifts of runs.

Revision ID: 0004
Revises: 0003
Create Date: 2026-12-01
"""

from __future__ import annotations

import sqlalchemy as sa
from alembic import op

revision = "0004"
down_revision = "0003"
branch_labels = None
depends_on = None


Real = sa.Double().with_variant(sa.REAL(), "sqlite")


def upgrade() -> None:
    op.create_table(
        "log_curve",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("event", sa.Integer(), nullable=False),
        sa.Column("well_id", sa.Integer(), nullable=False),
        sa.Column("log", sa.Text(), nullable=False),
        sa.Column("file", sa.Text(), nullable=False),
        sa.Column("content_digest", sa.Text(), nullable=False),
        sa.Column("mnemonic", sa.Text(), nullable=False),
        sa.Column("unit", sa.Text(), nullable=False),
        sa.Column("quantity", sa.Text(), nullable=False),
        sa.Column("description", sa.Text(), nullable=False),
        sa.Column("depths", sa.Text(), nullable=False),
        sa.Column("readings", sa.Text(), nullable=False),
        sa.Column("digest", sa.Text(), nullable=False),
        sa.CheckConstraint("length(content_digest) = 64", name=op.f("ck_log_curve_content_digest")),
        sa.CheckConstraint("length(digest) = 64", name=op.f("ck_log_curve_digest")),
        sa.CheckConstraint("length(mnemonic) > 0", name=op.f("ck_log_curve_mnemonic")),
        sa.ForeignKeyConstraint(
            ["event"],
            ["event.number"],
            name=op.f("fk_log_curve_event"),
            initially="DEFERRED",
            deferrable=True,
        ),
        sa.ForeignKeyConstraint(["well_id"], ["well.id"], name=op.f("fk_log_curve_well_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_log_curve")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_log_curve_event"), "log_curve", ["event"], unique=False)
    op.create_index(op.f("ix_log_curve_well_id"), "log_curve", ["well_id"], unique=False)
    op.create_table(
        "depth_shift",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("event", sa.Integer(), nullable=False),
        sa.Column("run_id", sa.Integer(), nullable=True),
        sa.Column("gun_run_id", sa.Integer(), nullable=True),
        sa.Column("log_curve_id", sa.Integer(), nullable=True),
        sa.Column("shift_m", Real, nullable=False),
        sa.Column("uncertainty_m", Real, nullable=True),
        sa.Column("correlation", Real, nullable=True),
        sa.Column("certain", sa.Integer(), nullable=False),
        sa.Column("basis", sa.Text(), nullable=False),
        sa.Column("detail", sa.Text(), nullable=False),
        sa.Column("digest", sa.Text(), nullable=False),
        sa.CheckConstraint("basis IN ('matched', 'person')", name=op.f("ck_depth_shift_basis")),
        sa.CheckConstraint("(run_id IS NULL) <> (gun_run_id IS NULL)", name=op.f("ck_depth_shift_one_run")),
        sa.CheckConstraint("certain IN (0, 1)", name=op.f("ck_depth_shift_certain")),
        sa.CheckConstraint("length(digest) = 64", name=op.f("ck_depth_shift_digest")),
        sa.CheckConstraint("shift_m >= -500.0 AND shift_m <= 500.0", name=op.f("ck_depth_shift_shift_m")),
        sa.ForeignKeyConstraint(
            ["event"],
            ["event.number"],
            name=op.f("fk_depth_shift_event"),
            initially="DEFERRED",
            deferrable=True,
        ),
        sa.ForeignKeyConstraint(["gun_run_id"], ["gun_run.id"], name=op.f("fk_depth_shift_gun_run_id")),
        sa.ForeignKeyConstraint(["log_curve_id"], ["log_curve.id"], name=op.f("fk_depth_shift_log_curve_id")),
        sa.ForeignKeyConstraint(["run_id"], ["run.id"], name=op.f("fk_depth_shift_run_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_depth_shift")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_depth_shift_event"), "depth_shift", ["event"], unique=False)
    op.create_index(op.f("ix_depth_shift_gun_run_id"), "depth_shift", ["gun_run_id"], unique=False)
    op.create_index(op.f("ix_depth_shift_log_curve_id"), "depth_shift", ["log_curve_id"], unique=False)
    op.create_index(op.f("ix_depth_shift_run_id"), "depth_shift", ["run_id"], unique=False)


def downgrade() -> None:
    raise RuntimeError("a record of readings is never downgraded: restore the backup made before the upgrade")
