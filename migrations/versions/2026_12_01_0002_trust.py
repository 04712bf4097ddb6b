"""Trust: persons who left, passwords, approvals with frozen results, releases, files issued.

Revision ID: 0002
Revises: 0001
Create Date: 2026-12-01
"""

from __future__ import annotations

import sqlalchemy as sa
from alembic import op

revision = "0002"
down_revision = "0001"
branch_labels = None
depends_on = None


Real = sa.Double().with_variant(sa.REAL(), "sqlite")


def _person_role_before() -> sa.Table:
    return sa.Table(
        "person_role",
        sa.MetaData(),
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("event", sa.Integer(), nullable=False),
        sa.Column("person_id", sa.Integer(), nullable=False),
        sa.Column("role", sa.Text(), nullable=False),
        sa.Column("digest", sa.Text(), nullable=False),
        sa.CheckConstraint(
            "role IN ('technician', 'reviewer', 'geologist', 'manager')", name="ck_person_role_role"
        ),
        sa.CheckConstraint("length(digest) = 64", name="ck_person_role_digest"),
        sa.ForeignKeyConstraint(
            ["event"], ["event.number"], name="fk_person_role_event", initially="DEFERRED", deferrable=True
        ),
        sa.ForeignKeyConstraint(["person_id"], ["person.id"], name="fk_person_role_person_id"),
        sa.PrimaryKeyConstraint("id", name="pk_person_role"),
        sqlite_strict=True,
    )


def upgrade() -> None:
    with op.batch_alter_table("person_role", copy_from=_person_role_before()) as batch:
        batch.drop_constraint(op.f("ck_person_role_role"), type_="check")
        batch.create_check_constraint(
            op.f("ck_person_role_role"), "role IN ('technician', 'reviewer', 'geologist', 'manager', 'left')"
        )
    if op.get_bind().dialect.name == "sqlite":  # the table was rebuilt there, and its indexes went with it
        op.create_index(op.f("ix_person_role_event"), "person_role", ["event"], unique=False)
        op.create_index(op.f("ix_person_role_person_id"), "person_role", ["person_id"], unique=False)
    op.create_table(
        "credential",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("event", sa.Integer(), nullable=False),
        sa.Column("person_id", sa.Integer(), nullable=False),
        sa.Column("secret", sa.Text(), nullable=False),
        sa.Column("digest", sa.Text(), nullable=False),
        sa.CheckConstraint("secret LIKE '$argon2id$%'", name=op.f("ck_credential_secret")),
        sa.CheckConstraint("length(digest) = 64", name=op.f("ck_credential_digest")),
        sa.ForeignKeyConstraint(
            ["event"],
            ["event.number"],
            name=op.f("fk_credential_event"),
            initially="DEFERRED",
            deferrable=True,
        ),
        sa.ForeignKeyConstraint(["person_id"], ["person.id"], name=op.f("fk_credential_person_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_credential")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_credential_event"), "credential", ["event"], unique=False)
    op.create_index(op.f("ix_credential_person_id"), "credential", ["person_id"], unique=False)
    op.create_table(
        "approval",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("event", sa.Integer(), nullable=False),
        sa.Column("plug_id", sa.Integer(), nullable=False),
        sa.Column("verdict", sa.Text(), nullable=False),
        sa.Column("grounds", sa.Text(), nullable=False),
        sa.Column("digest", sa.Text(), nullable=False),
        sa.CheckConstraint("verdict IN ('approved', 'revoked')", name=op.f("ck_approval_verdict")),
        sa.CheckConstraint("length(digest) = 64", name=op.f("ck_approval_digest")),
        sa.ForeignKeyConstraint(
            ["event"], ["event.number"], name=op.f("fk_approval_event"), initially="DEFERRED", deferrable=True
        ),
        sa.ForeignKeyConstraint(["plug_id"], ["plug.id"], name=op.f("fk_approval_plug_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_approval")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_approval_event"), "approval", ["event"], unique=False)
    op.create_index(op.f("ix_approval_plug_id"), "approval", ["plug_id"], unique=False)
    op.create_table(
        "approved_result",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("event", sa.Integer(), nullable=False),
        sa.Column("approval_id", sa.Integer(), nullable=False),
        sa.Column("quantity", sa.Text(), nullable=False),
        sa.Column("direction", sa.Text(), nullable=False),
        sa.Column("stress_mpa", Real, nullable=False),
        sa.Column("step", sa.Text(), nullable=False),
        sa.Column("value", Real, nullable=True),
        sa.Column("uncertainty", Real, nullable=True),
        sa.Column("value_limit", sa.Text(), nullable=True),
        sa.Column("basis", sa.Text(), nullable=False),
        sa.Column("method", sa.Text(), nullable=False),
        sa.Column("version", sa.Integer(), nullable=False),
        sa.Column("flags", sa.Text(), nullable=False),
        sa.Column("reason", sa.Text(), nullable=False),
        sa.Column("fingerprint", sa.Text(), nullable=False),
        sa.Column("digest", sa.Text(), nullable=False),
        sa.CheckConstraint("value_limit IN ('below', 'above')", name=op.f("ck_approved_result_value_limit")),
        sa.CheckConstraint("length(digest) = 64", name=op.f("ck_approved_result_digest")),
        sa.CheckConstraint("value IS NOT NULL OR length(reason) > 0", name=op.f("ck_approved_result_value")),
        sa.ForeignKeyConstraint(
            ["approval_id"], ["approval.id"], name=op.f("fk_approved_result_approval_id")
        ),
        sa.ForeignKeyConstraint(
            ["event"],
            ["event.number"],
            name=op.f("fk_approved_result_event"),
            initially="DEFERRED",
            deferrable=True,
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_approved_result")),
        sa.UniqueConstraint(
            "approval_id",
            "quantity",
            "direction",
            "stress_mpa",
            "step",
            name=op.f("uq_approved_result_approval_id_quantity_direction_stress_mpa_step"),
        ),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_approved_result_approval_id"), "approved_result", ["approval_id"], unique=False)
    op.create_index(op.f("ix_approved_result_event"), "approved_result", ["event"], unique=False)
    op.create_table(
        "control_release",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("event", sa.Integer(), nullable=False),
        sa.Column("plug_id", sa.Integer(), nullable=False),
        sa.Column("blocked", sa.Text(), nullable=False),
        sa.Column("results_digest", sa.Text(), nullable=False),
        sa.Column("digest", sa.Text(), nullable=False),
        sa.CheckConstraint("length(blocked) > 0", name=op.f("ck_control_release_blocked")),
        sa.CheckConstraint("length(digest) = 64", name=op.f("ck_control_release_digest")),
        sa.CheckConstraint("length(results_digest) = 64", name=op.f("ck_control_release_results_digest")),
        sa.ForeignKeyConstraint(
            ["event"],
            ["event.number"],
            name=op.f("fk_control_release_event"),
            initially="DEFERRED",
            deferrable=True,
        ),
        sa.ForeignKeyConstraint(["plug_id"], ["plug.id"], name=op.f("fk_control_release_plug_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_control_release")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_control_release_event"), "control_release", ["event"], unique=False)
    op.create_index(op.f("ix_control_release_plug_id"), "control_release", ["plug_id"], unique=False)
    op.create_table(
        "export",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("event", sa.Integer(), nullable=False),
        sa.Column("well_id", sa.Integer(), nullable=False),
        sa.Column("kind", sa.Text(), nullable=False),
        sa.Column("recipient", sa.Text(), nullable=False),
        sa.Column("issue", sa.Integer(), nullable=False),
        sa.Column("file", sa.Text(), nullable=False),
        sa.Column("request", sa.Text(), nullable=False),
        sa.Column("shown", sa.Text(), nullable=False),
        sa.Column("content", sa.LargeBinary(), nullable=False),
        sa.Column("content_digest", sa.Text(), nullable=False),
        sa.Column("digest", sa.Text(), nullable=False),
        sa.CheckConstraint("issue > 0", name=op.f("ck_export_issue")),
        sa.CheckConstraint("length(content_digest) = 64", name=op.f("ck_export_content_digest")),
        sa.CheckConstraint("length(digest) = 64", name=op.f("ck_export_digest")),
        sa.ForeignKeyConstraint(
            ["event"], ["event.number"], name=op.f("fk_export_event"), initially="DEFERRED", deferrable=True
        ),
        sa.ForeignKeyConstraint(["well_id"], ["well.id"], name=op.f("fk_export_well_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_export")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_export_event"), "export", ["event"], unique=False)
    op.create_index(op.f("ix_export_well_id"), "export", ["well_id"], unique=False)


def downgrade() -> None:
    raise RuntimeError("a record of readings is never downgraded: restore the backup made before the upgrade")
