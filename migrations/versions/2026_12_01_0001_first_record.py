"""The first record: identities, entries and their typed values, results, settings, persons, history.

Revision ID: 0001
Revises:
Create Date: 2026-12-01
"""

from __future__ import annotations

import sqlalchemy as sa
from alembic import op

revision = "0001"
down_revision = None
branch_labels = None
depends_on = None


Real = sa.Double().with_variant(sa.REAL(), "sqlite")


def upgrade() -> None:
    op.create_table(
        "event",
        sa.Column("number", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("at", sa.Text(), nullable=False),
        sa.Column("person", sa.Text(), nullable=False),
        sa.Column("command", sa.Text(), nullable=False),
        sa.Column("program_version", sa.Text(), nullable=False),
        sa.Column("reason", sa.Text(), nullable=False),
        sa.Column("detail", sa.Text(), nullable=False),
        sa.Column("row_count", sa.Integer(), nullable=False),
        sa.Column("rows_digest", sa.Text(), nullable=False),
        sa.Column("previous_digest", sa.Text(), nullable=False),
        sa.Column("digest", sa.Text(), nullable=False),
        sa.CheckConstraint("length(digest) = 64", name=op.f("ck_event_digest")),
        sa.CheckConstraint("length(previous_digest) = 64", name=op.f("ck_event_previous_digest")),
        sa.CheckConstraint("length(rows_digest) = 64", name=op.f("ck_event_rows_digest")),
        sa.CheckConstraint("number > 0", name=op.f("ck_event_number")),
        sa.CheckConstraint("row_count >= 0", name=op.f("ck_event_row_count")),
        sa.PrimaryKeyConstraint("number", name=op.f("pk_event")),
        sqlite_strict=True,
    )
    op.create_table(
        "entry",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("event", sa.Integer(), nullable=False),
        sa.Column("kind", sa.Text(), nullable=False),
        sa.Column("supersedes", sa.Integer(), nullable=True),
        sa.Column("file", sa.Text(), nullable=False),
        sa.Column("sheet", sa.Text(), nullable=False),
        sa.Column("row", sa.Integer(), nullable=True),
        sa.Column("entered", sa.Text(), nullable=False),
        sa.Column("digest", sa.Text(), nullable=False),
        sa.CheckConstraint(
            "kind <> 'withdrawal' OR supersedes IS NOT NULL", name=op.f("ck_entry_withdrawal")
        ),
        sa.CheckConstraint(
            "kind IN ('jobs', 'wells', 'core runs', 'core sections', 'sidewall shots', 'plugs', 'descriptions', 'crush verdicts', 'instruments', 'standards', 'certified values', 'treatments', 'not measured', 'dimensions', 'immersion', 'masses', 'porosimeter calibration', 'grain volume', 'pore volume', 'gas permeability', 'reported permeability', 'liquid permeability', 'distillation', 'retort', 'sieve', 'core gamma', 'withdrawal')",
            name=op.f("ck_entry_kind"),
        ),
        sa.CheckConstraint("length(digest) = 64", name=op.f("ck_entry_digest")),
        sa.CheckConstraint("supersedes IS NULL OR supersedes < id", name=op.f("ck_entry_supersedes")),
        sa.ForeignKeyConstraint(
            ["event"], ["event.number"], name=op.f("fk_entry_event"), initially="DEFERRED", deferrable=True
        ),
        sa.ForeignKeyConstraint(["supersedes"], ["entry.id"], name=op.f("fk_entry_supersedes")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_entry")),
        sa.UniqueConstraint("supersedes", name=op.f("uq_entry_supersedes")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_entry_event"), "entry", ["event"], unique=False)
    op.create_table(
        "instrument",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("event", sa.Integer(), nullable=False),
        sa.Column("name", sa.Text(), nullable=False),
        sa.Column("name_key", sa.Text(), nullable=False),
        sa.Column("digest", sa.Text(), nullable=False),
        sa.CheckConstraint("length(digest) = 64", name=op.f("ck_instrument_digest")),
        sa.CheckConstraint("length(name) > 0", name=op.f("ck_instrument_name")),
        sa.CheckConstraint("length(name_key) > 0", name=op.f("ck_instrument_name_key")),
        sa.ForeignKeyConstraint(
            ["event"],
            ["event.number"],
            name=op.f("fk_instrument_event"),
            initially="DEFERRED",
            deferrable=True,
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_instrument")),
        sa.UniqueConstraint("name_key", name=op.f("uq_instrument_name_key")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_instrument_event"), "instrument", ["event"], unique=False)
    op.create_table(
        "job",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("event", sa.Integer(), nullable=False),
        sa.Column("name", sa.Text(), nullable=False),
        sa.Column("name_key", sa.Text(), nullable=False),
        sa.Column("digest", sa.Text(), nullable=False),
        sa.CheckConstraint("length(digest) = 64", name=op.f("ck_job_digest")),
        sa.CheckConstraint("length(name) > 0", name=op.f("ck_job_name")),
        sa.CheckConstraint("length(name_key) > 0", name=op.f("ck_job_name_key")),
        sa.ForeignKeyConstraint(
            ["event"], ["event.number"], name=op.f("fk_job_event"), initially="DEFERRED", deferrable=True
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_job")),
        sa.UniqueConstraint("name_key", name=op.f("uq_job_name_key")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_job_event"), "job", ["event"], unique=False)
    op.create_table(
        "person",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("event", sa.Integer(), nullable=False),
        sa.Column("name", sa.Text(), nullable=False),
        sa.Column("name_key", sa.Text(), nullable=False),
        sa.Column("digest", sa.Text(), nullable=False),
        sa.CheckConstraint("length(digest) = 64", name=op.f("ck_person_digest")),
        sa.CheckConstraint("length(name) > 0", name=op.f("ck_person_name")),
        sa.CheckConstraint("length(name_key) > 0", name=op.f("ck_person_name_key")),
        sa.ForeignKeyConstraint(
            ["event"], ["event.number"], name=op.f("fk_person_event"), initially="DEFERRED", deferrable=True
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_person")),
        sa.UniqueConstraint("name_key", name=op.f("uq_person_name_key")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_person_event"), "person", ["event"], unique=False)
    op.create_table(
        "setting",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("event", sa.Integer(), nullable=False),
        sa.Column("name", sa.Text(), nullable=False),
        sa.Column("value", sa.Text(), nullable=False),
        sa.Column("digest", sa.Text(), nullable=False),
        sa.CheckConstraint("length(digest) = 64", name=op.f("ck_setting_digest")),
        sa.ForeignKeyConstraint(
            ["event"], ["event.number"], name=op.f("fk_setting_event"), initially="DEFERRED", deferrable=True
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_setting")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_setting_event"), "setting", ["event"], unique=False)
    op.create_table(
        "well",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("event", sa.Integer(), nullable=False),
        sa.Column("name", sa.Text(), nullable=False),
        sa.Column("name_key", sa.Text(), nullable=False),
        sa.Column("digest", sa.Text(), nullable=False),
        sa.CheckConstraint("length(digest) = 64", name=op.f("ck_well_digest")),
        sa.CheckConstraint("length(name) > 0", name=op.f("ck_well_name")),
        sa.CheckConstraint("length(name_key) > 0", name=op.f("ck_well_name_key")),
        sa.ForeignKeyConstraint(
            ["event"], ["event.number"], name=op.f("fk_well_event"), initially="DEFERRED", deferrable=True
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_well")),
        sa.UniqueConstraint("name_key", name=op.f("uq_well_name_key")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_well_event"), "well", ["event"], unique=False)
    op.create_table(
        "gun_run",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("event", sa.Integer(), nullable=False),
        sa.Column("well_id", sa.Integer(), nullable=False),
        sa.Column("name", sa.Text(), nullable=False),
        sa.Column("name_key", sa.Text(), nullable=False),
        sa.Column("digest", sa.Text(), nullable=False),
        sa.CheckConstraint("length(digest) = 64", name=op.f("ck_gun_run_digest")),
        sa.CheckConstraint("length(name) > 0", name=op.f("ck_gun_run_name")),
        sa.CheckConstraint("length(name_key) > 0", name=op.f("ck_gun_run_name_key")),
        sa.ForeignKeyConstraint(
            ["event"], ["event.number"], name=op.f("fk_gun_run_event"), initially="DEFERRED", deferrable=True
        ),
        sa.ForeignKeyConstraint(["well_id"], ["well.id"], name=op.f("fk_gun_run_well_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_gun_run")),
        sa.UniqueConstraint("well_id", "name_key", name=op.f("uq_gun_run_well_id_name_key")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_gun_run_event"), "gun_run", ["event"], unique=False)
    op.create_index(op.f("ix_gun_run_well_id"), "gun_run", ["well_id"], unique=False)
    op.create_table(
        "instruments",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("instrument_id", sa.Integer(), nullable=False),
        sa.Column("measures", sa.Text(), nullable=False),
        sa.Column("repeatability", Real, nullable=False),
        sa.Column("scale_uncertainty", Real, nullable=True),
        sa.Column("uncertainty_unit", sa.Text(), nullable=False),
        sa.Column("certificate", sa.Text(), nullable=True),
        sa.Column("calibrated_on", sa.Text(), nullable=True),
        sa.Column("due_on", sa.Text(), nullable=True),
        sa.Column("remarks", sa.Text(), nullable=True),
        sa.CheckConstraint("calibrated_on LIKE '____-__-__%'", name=op.f("ck_instruments_calibrated_on")),
        sa.CheckConstraint("due_on LIKE '____-__-__%'", name=op.f("ck_instruments_due_on")),
        sa.CheckConstraint(
            "measures IN ('mass', 'length', 'pressure', 'flow rate', 'volume', 'temperature')",
            name=op.f("ck_instruments_measures"),
        ),
        sa.CheckConstraint("length(certificate) > 0", name=op.f("ck_instruments_certificate")),
        sa.CheckConstraint("length(remarks) > 0", name=op.f("ck_instruments_remarks")),
        sa.CheckConstraint("length(uncertainty_unit) > 0", name=op.f("ck_instruments_uncertainty_unit")),
        sa.CheckConstraint(
            "repeatability >= 0.0 AND repeatability <= 1e+300", name=op.f("ck_instruments_repeatability")
        ),
        sa.CheckConstraint(
            "scale_uncertainty >= 0.0 AND scale_uncertainty <= 1e+300",
            name=op.f("ck_instruments_scale_uncertainty"),
        ),
        sa.ForeignKeyConstraint(["id"], ["entry.id"], name=op.f("fk_instruments_id")),
        sa.ForeignKeyConstraint(
            ["instrument_id"], ["instrument.id"], name=op.f("fk_instruments_instrument_id")
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_instruments")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_instruments_instrument_id"), "instruments", ["instrument_id"], unique=False)
    op.create_table(
        "jobs",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("job_id", sa.Integer(), nullable=False),
        sa.Column("laboratory", sa.Text(), nullable=False),
        sa.Column("client", sa.Text(), nullable=True),
        sa.Column("partners", sa.Text(), nullable=True),
        sa.Column("report_number", sa.Text(), nullable=True),
        sa.Column("received_on", sa.Text(), nullable=True),
        sa.Column("remarks", sa.Text(), nullable=True),
        sa.CheckConstraint("received_on LIKE '____-__-__%'", name=op.f("ck_jobs_received_on")),
        sa.CheckConstraint("length(client) > 0", name=op.f("ck_jobs_client")),
        sa.CheckConstraint("length(laboratory) > 0", name=op.f("ck_jobs_laboratory")),
        sa.CheckConstraint("length(partners) > 0", name=op.f("ck_jobs_partners")),
        sa.CheckConstraint("length(remarks) > 0", name=op.f("ck_jobs_remarks")),
        sa.CheckConstraint("length(report_number) > 0", name=op.f("ck_jobs_report_number")),
        sa.ForeignKeyConstraint(["id"], ["entry.id"], name=op.f("fk_jobs_id")),
        sa.ForeignKeyConstraint(["job_id"], ["job.id"], name=op.f("fk_jobs_job_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_jobs")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_jobs_job_id"), "jobs", ["job_id"], unique=False)
    op.create_table(
        "person_role",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("event", sa.Integer(), nullable=False),
        sa.Column("person_id", sa.Integer(), nullable=False),
        sa.Column("role", sa.Text(), nullable=False),
        sa.Column("digest", sa.Text(), nullable=False),
        sa.CheckConstraint(
            "role IN ('technician', 'reviewer', 'geologist', 'manager')", name=op.f("ck_person_role_role")
        ),
        sa.CheckConstraint("length(digest) = 64", name=op.f("ck_person_role_digest")),
        sa.ForeignKeyConstraint(
            ["event"],
            ["event.number"],
            name=op.f("fk_person_role_event"),
            initially="DEFERRED",
            deferrable=True,
        ),
        sa.ForeignKeyConstraint(["person_id"], ["person.id"], name=op.f("fk_person_role_person_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_person_role")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_person_role_event"), "person_role", ["event"], unique=False)
    op.create_index(op.f("ix_person_role_person_id"), "person_role", ["person_id"], unique=False)
    op.create_table(
        "plug",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("event", sa.Integer(), nullable=False),
        sa.Column("well_id", sa.Integer(), nullable=False),
        sa.Column("name", sa.Text(), nullable=False),
        sa.Column("name_key", sa.Text(), nullable=False),
        sa.Column("digest", sa.Text(), nullable=False),
        sa.CheckConstraint("length(digest) = 64", name=op.f("ck_plug_digest")),
        sa.CheckConstraint("length(name) > 0", name=op.f("ck_plug_name")),
        sa.CheckConstraint("length(name_key) > 0", name=op.f("ck_plug_name_key")),
        sa.ForeignKeyConstraint(
            ["event"], ["event.number"], name=op.f("fk_plug_event"), initially="DEFERRED", deferrable=True
        ),
        sa.ForeignKeyConstraint(["well_id"], ["well.id"], name=op.f("fk_plug_well_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_plug")),
        sa.UniqueConstraint("well_id", "name_key", name=op.f("uq_plug_well_id_name_key")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_plug_event"), "plug", ["event"], unique=False)
    op.create_index(op.f("ix_plug_well_id"), "plug", ["well_id"], unique=False)
    op.create_table(
        "porosimeter_calibration",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("instrument_id", sa.Integer(), nullable=False),
        sa.Column("setup", sa.Text(), nullable=False),
        sa.Column("calibration", sa.Text(), nullable=True),
        sa.Column("known_volume_cm3", Real, nullable=False),
        sa.Column("reference_pressure_kpa", Real, nullable=False),
        sa.Column("reference_pressure_gauge", sa.Integer(), nullable=False),
        sa.Column("expanded_pressure_kpa", Real, nullable=False),
        sa.Column("expanded_pressure_gauge", sa.Integer(), nullable=False),
        sa.Column("barometric_pressure_kpa", Real, nullable=True),
        sa.Column("temperature_degc", Real, nullable=True),
        sa.Column("net_confining_stress_mpa", Real, nullable=True),
        sa.Column("measured_on", sa.Text(), nullable=True),
        sa.Column("measured_by", sa.Text(), nullable=True),
        sa.Column("repeat", sa.Integer(), nullable=False),
        sa.Column("remarks", sa.Text(), nullable=True),
        sa.CheckConstraint(
            "measured_on LIKE '____-__-__%'", name=op.f("ck_porosimeter_calibration_measured_on")
        ),
        sa.CheckConstraint("setup IN ('cup', 'holder')", name=op.f("ck_porosimeter_calibration_setup")),
        sa.CheckConstraint(
            "(expanded_pressure_gauge = 1 AND expanded_pressure_kpa >= -120.0 AND expanded_pressure_kpa <= 1e+300) OR (expanded_pressure_kpa >= 1e-12 AND expanded_pressure_kpa <= 1e+300)",
            name=op.f("ck_porosimeter_calibration_expanded_pressure_kpa"),
        ),
        sa.CheckConstraint(
            "(reference_pressure_gauge = 1 AND reference_pressure_kpa >= -120.0 AND reference_pressure_kpa <= 1e+300) OR (reference_pressure_kpa >= 1e-12 AND reference_pressure_kpa <= 1e+300)",
            name=op.f("ck_porosimeter_calibration_reference_pressure_kpa"),
        ),
        sa.CheckConstraint(
            "barometric_pressure_kpa >= 40.0 AND barometric_pressure_kpa <= 120.0",
            name=op.f("ck_porosimeter_calibration_barometric_pressure_kpa"),
        ),
        sa.CheckConstraint(
            "expanded_pressure_gauge IN (0, 1) AND (expanded_pressure_gauge IS NULL) = (expanded_pressure_kpa IS NULL)",
            name=op.f("ck_porosimeter_calibration_expanded_pressure_gauge"),
        ),
        sa.CheckConstraint(
            "known_volume_cm3 >= 0.0 AND known_volume_cm3 <= 1e+300",
            name=op.f("ck_porosimeter_calibration_known_volume_cm3"),
        ),
        sa.CheckConstraint("length(calibration) > 0", name=op.f("ck_porosimeter_calibration_calibration")),
        sa.CheckConstraint("length(measured_by) > 0", name=op.f("ck_porosimeter_calibration_measured_by")),
        sa.CheckConstraint("length(remarks) > 0", name=op.f("ck_porosimeter_calibration_remarks")),
        sa.CheckConstraint(
            "net_confining_stress_mpa >= 0.0 AND net_confining_stress_mpa <= 500.0",
            name=op.f("ck_porosimeter_calibration_net_confining_stress_mpa"),
        ),
        sa.CheckConstraint(
            "reference_pressure_gauge IN (0, 1) AND (reference_pressure_gauge IS NULL) = (reference_pressure_kpa IS NULL)",
            name=op.f("ck_porosimeter_calibration_reference_pressure_gauge"),
        ),
        sa.CheckConstraint("repeat >= 1", name=op.f("ck_porosimeter_calibration_repeat")),
        sa.CheckConstraint(
            "temperature_degc >= -50.0 AND temperature_degc <= 1000.0",
            name=op.f("ck_porosimeter_calibration_temperature_degc"),
        ),
        sa.ForeignKeyConstraint(["id"], ["entry.id"], name=op.f("fk_porosimeter_calibration_id")),
        sa.ForeignKeyConstraint(
            ["instrument_id"], ["instrument.id"], name=op.f("fk_porosimeter_calibration_instrument_id")
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_porosimeter_calibration")),
        sqlite_strict=True,
    )
    op.create_index(
        op.f("ix_porosimeter_calibration_instrument_id"),
        "porosimeter_calibration",
        ["instrument_id"],
        unique=False,
    )
    op.create_table(
        "run",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("event", sa.Integer(), nullable=False),
        sa.Column("well_id", sa.Integer(), nullable=False),
        sa.Column("name", sa.Text(), nullable=False),
        sa.Column("name_key", sa.Text(), nullable=False),
        sa.Column("digest", sa.Text(), nullable=False),
        sa.CheckConstraint("length(digest) = 64", name=op.f("ck_run_digest")),
        sa.CheckConstraint("length(name) > 0", name=op.f("ck_run_name")),
        sa.CheckConstraint("length(name_key) > 0", name=op.f("ck_run_name_key")),
        sa.ForeignKeyConstraint(
            ["event"], ["event.number"], name=op.f("fk_run_event"), initially="DEFERRED", deferrable=True
        ),
        sa.ForeignKeyConstraint(["well_id"], ["well.id"], name=op.f("fk_run_well_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_run")),
        sa.UniqueConstraint("well_id", "name_key", name=op.f("uq_run_well_id_name_key")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_run_event"), "run", ["event"], unique=False)
    op.create_index(op.f("ix_run_well_id"), "run", ["well_id"], unique=False)
    op.create_table(
        "wells",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("well_id", sa.Integer(), nullable=False),
        sa.Column("job_id", sa.Integer(), nullable=True),
        sa.Column("field", sa.Text(), nullable=True),
        sa.Column("country", sa.Text(), nullable=True),
        sa.Column("unique_well_identifier", sa.Text(), nullable=True),
        sa.Column("depth_unit", sa.Text(), nullable=False),
        sa.Column("depth_datum", sa.Text(), nullable=True),
        sa.Column("datum_elevation_m", Real, nullable=True),
        sa.Column("mud", sa.Text(), nullable=True),
        sa.Column("mud_filtrate_salinity_g_per_l", Real, nullable=True),
        sa.Column("bit_diameter_mm", Real, nullable=True),
        sa.Column("confidential_until", sa.Text(), nullable=True),
        sa.Column("remarks", sa.Text(), nullable=True),
        sa.CheckConstraint("confidential_until LIKE '____-__-__%'", name=op.f("ck_wells_confidential_until")),
        sa.CheckConstraint("depth_unit IN ('m', 'ft')", name=op.f("ck_wells_depth_unit")),
        sa.CheckConstraint(
            "mud IN ('water-based', 'oil-based', 'synthetic', 'air')", name=op.f("ck_wells_mud")
        ),
        sa.CheckConstraint(
            "bit_diameter_mm >= 20.0 AND bit_diameter_mm <= 2000.0", name=op.f("ck_wells_bit_diameter_mm")
        ),
        sa.CheckConstraint(
            "datum_elevation_m >= -500.0 AND datum_elevation_m <= 9000.0",
            name=op.f("ck_wells_datum_elevation_m"),
        ),
        sa.CheckConstraint("length(country) > 0", name=op.f("ck_wells_country")),
        sa.CheckConstraint("length(depth_datum) > 0", name=op.f("ck_wells_depth_datum")),
        sa.CheckConstraint("length(field) > 0", name=op.f("ck_wells_field")),
        sa.CheckConstraint("length(remarks) > 0", name=op.f("ck_wells_remarks")),
        sa.CheckConstraint(
            "length(unique_well_identifier) > 0", name=op.f("ck_wells_unique_well_identifier")
        ),
        sa.CheckConstraint(
            "mud_filtrate_salinity_g_per_l >= 0.0 AND mud_filtrate_salinity_g_per_l <= 500.0",
            name=op.f("ck_wells_mud_filtrate_salinity_g_per_l"),
        ),
        sa.ForeignKeyConstraint(["id"], ["entry.id"], name=op.f("fk_wells_id")),
        sa.ForeignKeyConstraint(["job_id"], ["job.id"], name=op.f("fk_wells_job_id")),
        sa.ForeignKeyConstraint(["well_id"], ["well.id"], name=op.f("fk_wells_well_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_wells")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_wells_job_id"), "wells", ["job_id"], unique=False)
    op.create_index(op.f("ix_wells_well_id"), "wells", ["well_id"], unique=False)
    op.create_table(
        "certified_values",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("standard_id", sa.Integer(), nullable=False),
        sa.Column("result", sa.Text(), nullable=False),
        sa.Column("certified_value", Real, nullable=False),
        sa.Column("unit", sa.Text(), nullable=False),
        sa.Column("standard_uncertainty", Real, nullable=False),
        sa.Column("gas", sa.Text(), nullable=True),
        sa.Column("mean_pressure_kpa", Real, nullable=True),
        sa.Column("net_confining_stress_mpa", Real, nullable=True),
        sa.Column("remarks", sa.Text(), nullable=True),
        sa.CheckConstraint("gas IN ('nitrogen', 'helium', 'air')", name=op.f("ck_certified_values_gas")),
        sa.CheckConstraint(
            "result IN ('bulk volume', 'grain volume', 'pore volume', 'dry mass', 'porosity', 'grain density', 'bulk density', 'gas permeability', 'mean pressure', 'klinkenberg permeability', 'slip factor', 'liquid permeability', 'inertial coefficient', 'oil saturation', 'water saturation', 'gas saturation')",
            name=op.f("ck_certified_values_result"),
        ),
        sa.CheckConstraint(
            "certified_value >= -1e+300 AND certified_value <= 1e+300",
            name=op.f("ck_certified_values_certified_value"),
        ),
        sa.CheckConstraint("length(remarks) > 0", name=op.f("ck_certified_values_remarks")),
        sa.CheckConstraint("length(unit) > 0", name=op.f("ck_certified_values_unit")),
        sa.CheckConstraint(
            "mean_pressure_kpa >= 1e-12 AND mean_pressure_kpa <= 1e+300",
            name=op.f("ck_certified_values_mean_pressure_kpa"),
        ),
        sa.CheckConstraint(
            "net_confining_stress_mpa >= 0.0 AND net_confining_stress_mpa <= 500.0",
            name=op.f("ck_certified_values_net_confining_stress_mpa"),
        ),
        sa.CheckConstraint(
            "standard_uncertainty >= 0.0 AND standard_uncertainty <= 1e+300",
            name=op.f("ck_certified_values_standard_uncertainty"),
        ),
        sa.ForeignKeyConstraint(["id"], ["entry.id"], name=op.f("fk_certified_values_id")),
        sa.ForeignKeyConstraint(["standard_id"], ["plug.id"], name=op.f("fk_certified_values_standard_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_certified_values")),
        sqlite_strict=True,
    )
    op.create_index(
        op.f("ix_certified_values_standard_id"), "certified_values", ["standard_id"], unique=False
    )
    op.create_table(
        "core_gamma",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("well_id", sa.Integer(), nullable=False),
        sa.Column("run_id", sa.Integer(), nullable=True),
        sa.Column("depth_m", Real, nullable=False),
        sa.Column("gamma_gapi", Real, nullable=False),
        sa.Column("measured_on", sa.Text(), nullable=True),
        sa.Column("measured_by", sa.Text(), nullable=True),
        sa.Column("repeat", sa.Integer(), nullable=False),
        sa.Column("remarks", sa.Text(), nullable=True),
        sa.CheckConstraint("measured_on LIKE '____-__-__%'", name=op.f("ck_core_gamma_measured_on")),
        sa.CheckConstraint("depth_m >= -500.0 AND depth_m <= 15000.0", name=op.f("ck_core_gamma_depth_m")),
        sa.CheckConstraint(
            "gamma_gapi >= 0.0 AND gamma_gapi <= 1e+300", name=op.f("ck_core_gamma_gamma_gapi")
        ),
        sa.CheckConstraint("length(measured_by) > 0", name=op.f("ck_core_gamma_measured_by")),
        sa.CheckConstraint("length(remarks) > 0", name=op.f("ck_core_gamma_remarks")),
        sa.CheckConstraint("repeat >= 1", name=op.f("ck_core_gamma_repeat")),
        sa.ForeignKeyConstraint(["id"], ["entry.id"], name=op.f("fk_core_gamma_id")),
        sa.ForeignKeyConstraint(["run_id"], ["run.id"], name=op.f("fk_core_gamma_run_id")),
        sa.ForeignKeyConstraint(["well_id"], ["well.id"], name=op.f("fk_core_gamma_well_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_core_gamma")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_core_gamma_run_id"), "core_gamma", ["run_id"], unique=False)
    op.create_index(op.f("ix_core_gamma_well_id"), "core_gamma", ["well_id"], unique=False)
    op.create_table(
        "core_runs",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("run_id", sa.Integer(), nullable=False),
        sa.Column("top_depth_m", Real, nullable=False),
        sa.Column("base_depth_m", Real, nullable=False),
        sa.Column("recovered_length_m", Real, nullable=False),
        sa.Column("core_diameter_mm", Real, nullable=True),
        sa.Column("loss_at", sa.Text(), nullable=False),
        sa.Column("cut_on", sa.Text(), nullable=True),
        sa.Column("remarks", sa.Text(), nullable=True),
        sa.CheckConstraint("cut_on LIKE '____-__-__%'", name=op.f("ck_core_runs_cut_on")),
        sa.CheckConstraint("loss_at IN ('top', 'base')", name=op.f("ck_core_runs_loss_at")),
        sa.CheckConstraint(
            "base_depth_m >= -500.0 AND base_depth_m <= 15000.0", name=op.f("ck_core_runs_base_depth_m")
        ),
        sa.CheckConstraint(
            "core_diameter_mm >= 5.0 AND core_diameter_mm <= 500.0",
            name=op.f("ck_core_runs_core_diameter_mm"),
        ),
        sa.CheckConstraint("length(remarks) > 0", name=op.f("ck_core_runs_remarks")),
        sa.CheckConstraint(
            "recovered_length_m >= 0.0 AND recovered_length_m <= 1000.0",
            name=op.f("ck_core_runs_recovered_length_m"),
        ),
        sa.CheckConstraint(
            "top_depth_m >= -500.0 AND top_depth_m <= 15000.0", name=op.f("ck_core_runs_top_depth_m")
        ),
        sa.ForeignKeyConstraint(["id"], ["entry.id"], name=op.f("fk_core_runs_id")),
        sa.ForeignKeyConstraint(["run_id"], ["run.id"], name=op.f("fk_core_runs_run_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_core_runs")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_core_runs_run_id"), "core_runs", ["run_id"], unique=False)
    op.create_table(
        "core_sections",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("run_id", sa.Integer(), nullable=False),
        sa.Column("section", sa.Text(), nullable=False),
        sa.Column("top_depth_m", Real, nullable=False),
        sa.Column("base_depth_m", Real, nullable=False),
        sa.Column("box", sa.Text(), nullable=True),
        sa.Column("state", sa.Text(), nullable=True),
        sa.Column("remarks", sa.Text(), nullable=True),
        sa.CheckConstraint(
            "state IN ('good', 'rubble', 'preserved', 'lost', 'elsewhere')",
            name=op.f("ck_core_sections_state"),
        ),
        sa.CheckConstraint(
            "base_depth_m >= -500.0 AND base_depth_m <= 15000.0", name=op.f("ck_core_sections_base_depth_m")
        ),
        sa.CheckConstraint("length(box) > 0", name=op.f("ck_core_sections_box")),
        sa.CheckConstraint("length(remarks) > 0", name=op.f("ck_core_sections_remarks")),
        sa.CheckConstraint("length(section) > 0", name=op.f("ck_core_sections_section")),
        sa.CheckConstraint(
            "top_depth_m >= -500.0 AND top_depth_m <= 15000.0", name=op.f("ck_core_sections_top_depth_m")
        ),
        sa.ForeignKeyConstraint(["id"], ["entry.id"], name=op.f("fk_core_sections_id")),
        sa.ForeignKeyConstraint(["run_id"], ["run.id"], name=op.f("fk_core_sections_run_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_core_sections")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_core_sections_run_id"), "core_sections", ["run_id"], unique=False)
    op.create_table(
        "crush_verdicts",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("plug_id", sa.Integer(), nullable=False),
        sa.Column("judged_by", sa.Text(), nullable=False),
        sa.Column("crushed", sa.Text(), nullable=False),
        sa.Column("seen_in", sa.Text(), nullable=True),
        sa.Column("judged_on", sa.Text(), nullable=True),
        sa.Column("remarks", sa.Text(), nullable=True),
        sa.CheckConstraint("crushed IN ('yes', 'no', 'unsure')", name=op.f("ck_crush_verdicts_crushed")),
        sa.CheckConstraint("judged_on LIKE '____-__-__%'", name=op.f("ck_crush_verdicts_judged_on")),
        sa.CheckConstraint(
            "seen_in IN ('hand specimen', 'thin section', 'scan')", name=op.f("ck_crush_verdicts_seen_in")
        ),
        sa.CheckConstraint("length(judged_by) > 0", name=op.f("ck_crush_verdicts_judged_by")),
        sa.CheckConstraint("length(remarks) > 0", name=op.f("ck_crush_verdicts_remarks")),
        sa.ForeignKeyConstraint(["id"], ["entry.id"], name=op.f("fk_crush_verdicts_id")),
        sa.ForeignKeyConstraint(["plug_id"], ["plug.id"], name=op.f("fk_crush_verdicts_plug_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_crush_verdicts")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_crush_verdicts_plug_id"), "crush_verdicts", ["plug_id"], unique=False)
    op.create_table(
        "descriptions",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("plug_id", sa.Integer(), nullable=False),
        sa.Column("lithology", sa.Text(), nullable=False),
        sa.Column("grain_size_mm", Real, nullable=True),
        sa.Column("grain_size_class", sa.Text(), nullable=True),
        sa.Column("sorting_phi", Real, nullable=True),
        sa.Column("sorting_class", sa.Text(), nullable=True),
        sa.Column("sorting_scale", sa.Text(), nullable=True),
        sa.Column("roundness", sa.Text(), nullable=True),
        sa.Column("firmness", sa.Text(), nullable=True),
        sa.Column("cement", sa.Text(), nullable=True),
        sa.Column("accessories", sa.Text(), nullable=True),
        sa.Column("colour", sa.Text(), nullable=True),
        sa.Column("stain", sa.Text(), nullable=True),
        sa.Column("fluorescence", sa.Text(), nullable=True),
        sa.Column("cut", sa.Text(), nullable=True),
        sa.Column("odour", sa.Text(), nullable=True),
        sa.Column("condition", sa.Text(), nullable=True),
        sa.Column("described_by", sa.Text(), nullable=True),
        sa.Column("remarks", sa.Text(), nullable=True),
        sa.CheckConstraint(
            "firmness IN ('loose', 'friable', 'firm', 'hard')", name=op.f("ck_descriptions_firmness")
        ),
        sa.CheckConstraint(
            "grain_size_class IN ('boulder', 'cobble', 'pebble', 'granule', 'very coarse sand', 'coarse sand', 'medium sand', 'fine sand', 'very fine sand', 'upper very coarse sand', 'lower very coarse sand', 'upper coarse sand', 'lower coarse sand', 'upper medium sand', 'lower medium sand', 'upper fine sand', 'lower fine sand', 'upper very fine sand', 'lower very fine sand', 'silt', 'clay')",
            name=op.f("ck_descriptions_grain_size_class"),
        ),
        sa.CheckConstraint(
            "roundness IN ('very angular', 'angular', 'subangular', 'subrounded', 'rounded', 'well rounded')",
            name=op.f("ck_descriptions_roundness"),
        ),
        sa.CheckConstraint(
            "sorting_class IN ('extremely well', 'very well', 'well', 'moderately well', 'moderately', 'poorly', 'very poorly', 'extremely poorly')",
            name=op.f("ck_descriptions_sorting_class"),
        ),
        sa.CheckConstraint("sorting_scale IN ('folk', 'trask')", name=op.f("ck_descriptions_sorting_scale")),
        sa.CheckConstraint(
            "grain_size_mm >= 1e-05 AND grain_size_mm <= 4096.0", name=op.f("ck_descriptions_grain_size_mm")
        ),
        sa.CheckConstraint("length(accessories) > 0", name=op.f("ck_descriptions_accessories")),
        sa.CheckConstraint("length(cement) > 0", name=op.f("ck_descriptions_cement")),
        sa.CheckConstraint("length(colour) > 0", name=op.f("ck_descriptions_colour")),
        sa.CheckConstraint("length(condition) > 0", name=op.f("ck_descriptions_condition")),
        sa.CheckConstraint("length(cut) > 0", name=op.f("ck_descriptions_cut")),
        sa.CheckConstraint("length(described_by) > 0", name=op.f("ck_descriptions_described_by")),
        sa.CheckConstraint("length(fluorescence) > 0", name=op.f("ck_descriptions_fluorescence")),
        sa.CheckConstraint("length(lithology) > 0", name=op.f("ck_descriptions_lithology")),
        sa.CheckConstraint("length(odour) > 0", name=op.f("ck_descriptions_odour")),
        sa.CheckConstraint("length(remarks) > 0", name=op.f("ck_descriptions_remarks")),
        sa.CheckConstraint("length(stain) > 0", name=op.f("ck_descriptions_stain")),
        sa.CheckConstraint(
            "sorting_phi >= 0.0 AND sorting_phi <= 20.0", name=op.f("ck_descriptions_sorting_phi")
        ),
        sa.ForeignKeyConstraint(["id"], ["entry.id"], name=op.f("fk_descriptions_id")),
        sa.ForeignKeyConstraint(["plug_id"], ["plug.id"], name=op.f("fk_descriptions_plug_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_descriptions")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_descriptions_plug_id"), "descriptions", ["plug_id"], unique=False)
    op.create_table(
        "dimensions",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("plug_id", sa.Integer(), nullable=False),
        sa.Column("length_1_cm", Real, nullable=False),
        sa.Column("length_2_cm", Real, nullable=True),
        sa.Column("length_3_cm", Real, nullable=True),
        sa.Column("length_4_cm", Real, nullable=True),
        sa.Column("length_5_cm", Real, nullable=True),
        sa.Column("length_6_cm", Real, nullable=True),
        sa.Column("length_7_cm", Real, nullable=True),
        sa.Column("length_8_cm", Real, nullable=True),
        sa.Column("length_9_cm", Real, nullable=True),
        sa.Column("length_10_cm", Real, nullable=True),
        sa.Column("diameter_1_cm", Real, nullable=False),
        sa.Column("diameter_2_cm", Real, nullable=True),
        sa.Column("diameter_3_cm", Real, nullable=True),
        sa.Column("diameter_4_cm", Real, nullable=True),
        sa.Column("diameter_5_cm", Real, nullable=True),
        sa.Column("diameter_6_cm", Real, nullable=True),
        sa.Column("diameter_7_cm", Real, nullable=True),
        sa.Column("diameter_8_cm", Real, nullable=True),
        sa.Column("diameter_9_cm", Real, nullable=True),
        sa.Column("diameter_10_cm", Real, nullable=True),
        sa.Column("caliper_id", sa.Integer(), nullable=True),
        sa.Column("measured_on", sa.Text(), nullable=True),
        sa.Column("measured_by", sa.Text(), nullable=True),
        sa.Column("repeat", sa.Integer(), nullable=False),
        sa.Column("remarks", sa.Text(), nullable=True),
        sa.CheckConstraint("measured_on LIKE '____-__-__%'", name=op.f("ck_dimensions_measured_on")),
        sa.CheckConstraint(
            "diameter_10_cm >= 0.01 AND diameter_10_cm <= 50.0", name=op.f("ck_dimensions_diameter_10_cm")
        ),
        sa.CheckConstraint(
            "diameter_1_cm >= 0.01 AND diameter_1_cm <= 50.0", name=op.f("ck_dimensions_diameter_1_cm")
        ),
        sa.CheckConstraint(
            "diameter_2_cm >= 0.01 AND diameter_2_cm <= 50.0", name=op.f("ck_dimensions_diameter_2_cm")
        ),
        sa.CheckConstraint(
            "diameter_3_cm >= 0.01 AND diameter_3_cm <= 50.0", name=op.f("ck_dimensions_diameter_3_cm")
        ),
        sa.CheckConstraint(
            "diameter_4_cm >= 0.01 AND diameter_4_cm <= 50.0", name=op.f("ck_dimensions_diameter_4_cm")
        ),
        sa.CheckConstraint(
            "diameter_5_cm >= 0.01 AND diameter_5_cm <= 50.0", name=op.f("ck_dimensions_diameter_5_cm")
        ),
        sa.CheckConstraint(
            "diameter_6_cm >= 0.01 AND diameter_6_cm <= 50.0", name=op.f("ck_dimensions_diameter_6_cm")
        ),
        sa.CheckConstraint(
            "diameter_7_cm >= 0.01 AND diameter_7_cm <= 50.0", name=op.f("ck_dimensions_diameter_7_cm")
        ),
        sa.CheckConstraint(
            "diameter_8_cm >= 0.01 AND diameter_8_cm <= 50.0", name=op.f("ck_dimensions_diameter_8_cm")
        ),
        sa.CheckConstraint(
            "diameter_9_cm >= 0.01 AND diameter_9_cm <= 50.0", name=op.f("ck_dimensions_diameter_9_cm")
        ),
        sa.CheckConstraint("length(measured_by) > 0", name=op.f("ck_dimensions_measured_by")),
        sa.CheckConstraint("length(remarks) > 0", name=op.f("ck_dimensions_remarks")),
        sa.CheckConstraint(
            "length_10_cm >= 0.01 AND length_10_cm <= 200.0", name=op.f("ck_dimensions_length_10_cm")
        ),
        sa.CheckConstraint(
            "length_1_cm >= 0.01 AND length_1_cm <= 200.0", name=op.f("ck_dimensions_length_1_cm")
        ),
        sa.CheckConstraint(
            "length_2_cm >= 0.01 AND length_2_cm <= 200.0", name=op.f("ck_dimensions_length_2_cm")
        ),
        sa.CheckConstraint(
            "length_3_cm >= 0.01 AND length_3_cm <= 200.0", name=op.f("ck_dimensions_length_3_cm")
        ),
        sa.CheckConstraint(
            "length_4_cm >= 0.01 AND length_4_cm <= 200.0", name=op.f("ck_dimensions_length_4_cm")
        ),
        sa.CheckConstraint(
            "length_5_cm >= 0.01 AND length_5_cm <= 200.0", name=op.f("ck_dimensions_length_5_cm")
        ),
        sa.CheckConstraint(
            "length_6_cm >= 0.01 AND length_6_cm <= 200.0", name=op.f("ck_dimensions_length_6_cm")
        ),
        sa.CheckConstraint(
            "length_7_cm >= 0.01 AND length_7_cm <= 200.0", name=op.f("ck_dimensions_length_7_cm")
        ),
        sa.CheckConstraint(
            "length_8_cm >= 0.01 AND length_8_cm <= 200.0", name=op.f("ck_dimensions_length_8_cm")
        ),
        sa.CheckConstraint(
            "length_9_cm >= 0.01 AND length_9_cm <= 200.0", name=op.f("ck_dimensions_length_9_cm")
        ),
        sa.CheckConstraint("repeat >= 1", name=op.f("ck_dimensions_repeat")),
        sa.ForeignKeyConstraint(["caliper_id"], ["instrument.id"], name=op.f("fk_dimensions_caliper_id")),
        sa.ForeignKeyConstraint(["id"], ["entry.id"], name=op.f("fk_dimensions_id")),
        sa.ForeignKeyConstraint(["plug_id"], ["plug.id"], name=op.f("fk_dimensions_plug_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_dimensions")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_dimensions_caliper_id"), "dimensions", ["caliper_id"], unique=False)
    op.create_index(op.f("ix_dimensions_plug_id"), "dimensions", ["plug_id"], unique=False)
    op.create_table(
        "distillation",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("plug_id", sa.Integer(), nullable=False),
        sa.Column("water_volume_cm3", Real, nullable=False),
        sa.Column("trap_temperature_degc", Real, nullable=True),
        sa.Column("brine_salinity_g_per_kg", Real, nullable=True),
        sa.Column("brine_density_g_cm3", Real, nullable=True),
        sa.Column("salt", sa.Text(), nullable=False),
        sa.Column("oil_density_g_cm3", Real, nullable=False),
        sa.Column("thimble_mass_g", Real, nullable=True),
        sa.Column("measured_on", sa.Text(), nullable=True),
        sa.Column("measured_by", sa.Text(), nullable=True),
        sa.Column("repeat", sa.Integer(), nullable=False),
        sa.Column("remarks", sa.Text(), nullable=True),
        sa.CheckConstraint("measured_on LIKE '____-__-__%'", name=op.f("ck_distillation_measured_on")),
        sa.CheckConstraint("salt IN ('none', 'left', 'leached')", name=op.f("ck_distillation_salt")),
        sa.CheckConstraint(
            "brine_density_g_cm3 >= 0.9 AND brine_density_g_cm3 <= 1.6",
            name=op.f("ck_distillation_brine_density_g_cm3"),
        ),
        sa.CheckConstraint(
            "brine_salinity_g_per_kg >= 0.0 AND brine_salinity_g_per_kg <= 400.0",
            name=op.f("ck_distillation_brine_salinity_g_per_kg"),
        ),
        sa.CheckConstraint("length(measured_by) > 0", name=op.f("ck_distillation_measured_by")),
        sa.CheckConstraint("length(remarks) > 0", name=op.f("ck_distillation_remarks")),
        sa.CheckConstraint(
            "oil_density_g_cm3 >= 0.3 AND oil_density_g_cm3 <= 1.5",
            name=op.f("ck_distillation_oil_density_g_cm3"),
        ),
        sa.CheckConstraint("repeat >= 1", name=op.f("ck_distillation_repeat")),
        sa.CheckConstraint(
            "thimble_mass_g >= 0.0 AND thimble_mass_g <= 1e+300", name=op.f("ck_distillation_thimble_mass_g")
        ),
        sa.CheckConstraint(
            "trap_temperature_degc >= 0.0 AND trap_temperature_degc <= 100.0",
            name=op.f("ck_distillation_trap_temperature_degc"),
        ),
        sa.CheckConstraint(
            "water_volume_cm3 >= 0.0 AND water_volume_cm3 <= 1e+300",
            name=op.f("ck_distillation_water_volume_cm3"),
        ),
        sa.ForeignKeyConstraint(["id"], ["entry.id"], name=op.f("fk_distillation_id")),
        sa.ForeignKeyConstraint(["plug_id"], ["plug.id"], name=op.f("fk_distillation_plug_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_distillation")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_distillation_plug_id"), "distillation", ["plug_id"], unique=False)
    op.create_table(
        "gas_permeability",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("plug_id", sa.Integer(), nullable=False),
        sa.Column("direction", sa.Text(), nullable=False),
        sa.Column("step", sa.Text(), nullable=False),
        sa.Column("net_confining_stress_mpa", Real, nullable=True),
        sa.Column("confining_pressure_kpa", Real, nullable=True),
        sa.Column("confining_pressure_gauge", sa.Integer(), nullable=True),
        sa.Column("stress_type", sa.Text(), nullable=True),
        sa.Column("gas", sa.Text(), nullable=False),
        sa.Column("upstream_pressure_kpa", Real, nullable=True),
        sa.Column("upstream_pressure_gauge", sa.Integer(), nullable=True),
        sa.Column("pressure_difference_kpa", Real, nullable=True),
        sa.Column("downstream_pressure_kpa", Real, nullable=True),
        sa.Column("downstream_pressure_gauge", sa.Integer(), nullable=True),
        sa.Column("flow_rate_cm3_per_s", Real, nullable=False),
        sa.Column("flow_basis", sa.Text(), nullable=False),
        sa.Column("flow_pressure_kpa", Real, nullable=True),
        sa.Column("flow_pressure_gauge", sa.Integer(), nullable=True),
        sa.Column("flow_temperature_degc", Real, nullable=True),
        sa.Column("standard_pressure_kpa", Real, nullable=True),
        sa.Column("standard_temperature_degc", Real, nullable=True),
        sa.Column("barometric_pressure_kpa", Real, nullable=True),
        sa.Column("temperature_degc", Real, nullable=True),
        sa.Column("geometric_factor", Real, nullable=True),
        sa.Column("permeameter_id", sa.Integer(), nullable=True),
        sa.Column("measured_on", sa.Text(), nullable=True),
        sa.Column("measured_by", sa.Text(), nullable=True),
        sa.Column("repeat", sa.Integer(), nullable=False),
        sa.Column("remarks", sa.Text(), nullable=True),
        sa.CheckConstraint(
            "direction IN ('axial', 'max', '90', 'vertical')", name=op.f("ck_gas_permeability_direction")
        ),
        sa.CheckConstraint(
            "flow_basis IN ('actual', 'standard')", name=op.f("ck_gas_permeability_flow_basis")
        ),
        sa.CheckConstraint("gas IN ('nitrogen', 'helium', 'air')", name=op.f("ck_gas_permeability_gas")),
        sa.CheckConstraint("measured_on LIKE '____-__-__%'", name=op.f("ck_gas_permeability_measured_on")),
        sa.CheckConstraint(
            "stress_type IN ('hydrostatic', 'biaxial')", name=op.f("ck_gas_permeability_stress_type")
        ),
        sa.CheckConstraint(
            "(confining_pressure_gauge = 1 AND confining_pressure_kpa >= -120.0 AND confining_pressure_kpa <= 1e+300) OR (confining_pressure_kpa >= 1e-12 AND confining_pressure_kpa <= 1e+300)",
            name=op.f("ck_gas_permeability_confining_pressure_kpa"),
        ),
        sa.CheckConstraint(
            "(downstream_pressure_gauge = 1 AND downstream_pressure_kpa >= -120.0 AND downstream_pressure_kpa <= 1e+300) OR (downstream_pressure_kpa >= 1e-12 AND downstream_pressure_kpa <= 1e+300)",
            name=op.f("ck_gas_permeability_downstream_pressure_kpa"),
        ),
        sa.CheckConstraint(
            "(flow_pressure_gauge = 1 AND flow_pressure_kpa >= -120.0 AND flow_pressure_kpa <= 1e+300) OR (flow_pressure_kpa >= 1e-12 AND flow_pressure_kpa <= 1e+300)",
            name=op.f("ck_gas_permeability_flow_pressure_kpa"),
        ),
        sa.CheckConstraint(
            "(upstream_pressure_gauge = 1 AND upstream_pressure_kpa >= -120.0 AND upstream_pressure_kpa <= 1e+300) OR (upstream_pressure_kpa >= 1e-12 AND upstream_pressure_kpa <= 1e+300)",
            name=op.f("ck_gas_permeability_upstream_pressure_kpa"),
        ),
        sa.CheckConstraint(
            "(upstream_pressure_kpa IS NOT NULL) OR (pressure_difference_kpa IS NOT NULL)",
            name=op.f("ck_gas_permeability_either_1"),
        ),
        sa.CheckConstraint(
            "barometric_pressure_kpa >= 40.0 AND barometric_pressure_kpa <= 120.0",
            name=op.f("ck_gas_permeability_barometric_pressure_kpa"),
        ),
        sa.CheckConstraint(
            "confining_pressure_gauge IN (0, 1) AND (confining_pressure_gauge IS NULL) = (confining_pressure_kpa IS NULL)",
            name=op.f("ck_gas_permeability_confining_pressure_gauge"),
        ),
        sa.CheckConstraint(
            "downstream_pressure_gauge IN (0, 1) AND (downstream_pressure_gauge IS NULL) = (downstream_pressure_kpa IS NULL)",
            name=op.f("ck_gas_permeability_downstream_pressure_gauge"),
        ),
        sa.CheckConstraint(
            "flow_pressure_gauge IN (0, 1) AND (flow_pressure_gauge IS NULL) = (flow_pressure_kpa IS NULL)",
            name=op.f("ck_gas_permeability_flow_pressure_gauge"),
        ),
        sa.CheckConstraint(
            "flow_rate_cm3_per_s >= 1e-12 AND flow_rate_cm3_per_s <= 1e+300",
            name=op.f("ck_gas_permeability_flow_rate_cm3_per_s"),
        ),
        sa.CheckConstraint(
            "flow_temperature_degc >= -50.0 AND flow_temperature_degc <= 200.0",
            name=op.f("ck_gas_permeability_flow_temperature_degc"),
        ),
        sa.CheckConstraint(
            "geometric_factor >= 1e-12 AND geometric_factor <= 1e+300",
            name=op.f("ck_gas_permeability_geometric_factor"),
        ),
        sa.CheckConstraint("length(measured_by) > 0", name=op.f("ck_gas_permeability_measured_by")),
        sa.CheckConstraint("length(remarks) > 0", name=op.f("ck_gas_permeability_remarks")),
        sa.CheckConstraint("length(step) > 0", name=op.f("ck_gas_permeability_step")),
        sa.CheckConstraint(
            "net_confining_stress_mpa >= 0.0 AND net_confining_stress_mpa <= 500.0",
            name=op.f("ck_gas_permeability_net_confining_stress_mpa"),
        ),
        sa.CheckConstraint(
            "pressure_difference_kpa >= 1e-12 AND pressure_difference_kpa <= 1e+300",
            name=op.f("ck_gas_permeability_pressure_difference_kpa"),
        ),
        sa.CheckConstraint("repeat >= 1", name=op.f("ck_gas_permeability_repeat")),
        sa.CheckConstraint(
            "standard_pressure_kpa >= 50.0 AND standard_pressure_kpa <= 200.0",
            name=op.f("ck_gas_permeability_standard_pressure_kpa"),
        ),
        sa.CheckConstraint(
            "standard_temperature_degc >= -50.0 AND standard_temperature_degc <= 200.0",
            name=op.f("ck_gas_permeability_standard_temperature_degc"),
        ),
        sa.CheckConstraint(
            "temperature_degc >= -50.0 AND temperature_degc <= 1000.0",
            name=op.f("ck_gas_permeability_temperature_degc"),
        ),
        sa.CheckConstraint(
            "upstream_pressure_gauge IN (0, 1) AND (upstream_pressure_gauge IS NULL) = (upstream_pressure_kpa IS NULL)",
            name=op.f("ck_gas_permeability_upstream_pressure_gauge"),
        ),
        sa.ForeignKeyConstraint(["id"], ["entry.id"], name=op.f("fk_gas_permeability_id")),
        sa.ForeignKeyConstraint(
            ["permeameter_id"], ["instrument.id"], name=op.f("fk_gas_permeability_permeameter_id")
        ),
        sa.ForeignKeyConstraint(["plug_id"], ["plug.id"], name=op.f("fk_gas_permeability_plug_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_gas_permeability")),
        sqlite_strict=True,
    )
    op.create_index(
        op.f("ix_gas_permeability_permeameter_id"), "gas_permeability", ["permeameter_id"], unique=False
    )
    op.create_index(op.f("ix_gas_permeability_plug_id"), "gas_permeability", ["plug_id"], unique=False)
    op.create_table(
        "grain_volume",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("plug_id", sa.Integer(), nullable=False),
        sa.Column("instrument_id", sa.Integer(), nullable=False),
        sa.Column("billet_volume_cm3", Real, nullable=True),
        sa.Column("reference_pressure_kpa", Real, nullable=True),
        sa.Column("reference_pressure_gauge", sa.Integer(), nullable=True),
        sa.Column("expanded_pressure_kpa", Real, nullable=True),
        sa.Column("expanded_pressure_gauge", sa.Integer(), nullable=True),
        sa.Column("barometric_pressure_kpa", Real, nullable=True),
        sa.Column("temperature_degc", Real, nullable=True),
        sa.Column("cup_temperature_degc", Real, nullable=True),
        sa.Column("grain_volume_cm3", Real, nullable=True),
        sa.Column("container_volume_cm3", Real, nullable=True),
        sa.Column("measured_on", sa.Text(), nullable=True),
        sa.Column("measured_by", sa.Text(), nullable=True),
        sa.Column("repeat", sa.Integer(), nullable=False),
        sa.Column("remarks", sa.Text(), nullable=True),
        sa.CheckConstraint("measured_on LIKE '____-__-__%'", name=op.f("ck_grain_volume_measured_on")),
        sa.CheckConstraint(
            "(expanded_pressure_gauge = 1 AND expanded_pressure_kpa >= -120.0 AND expanded_pressure_kpa <= 1e+300) OR (expanded_pressure_kpa >= 1e-12 AND expanded_pressure_kpa <= 1e+300)",
            name=op.f("ck_grain_volume_expanded_pressure_kpa"),
        ),
        sa.CheckConstraint(
            "(reference_pressure_gauge = 1 AND reference_pressure_kpa >= -120.0 AND reference_pressure_kpa <= 1e+300) OR (reference_pressure_kpa >= 1e-12 AND reference_pressure_kpa <= 1e+300)",
            name=op.f("ck_grain_volume_reference_pressure_kpa"),
        ),
        sa.CheckConstraint(
            "(reference_pressure_kpa IS NOT NULL AND expanded_pressure_kpa IS NOT NULL) OR (grain_volume_cm3 IS NOT NULL)",
            name=op.f("ck_grain_volume_either_1"),
        ),
        sa.CheckConstraint(
            "barometric_pressure_kpa >= 40.0 AND barometric_pressure_kpa <= 120.0",
            name=op.f("ck_grain_volume_barometric_pressure_kpa"),
        ),
        sa.CheckConstraint(
            "billet_volume_cm3 >= 0.0 AND billet_volume_cm3 <= 1e+300",
            name=op.f("ck_grain_volume_billet_volume_cm3"),
        ),
        sa.CheckConstraint(
            "container_volume_cm3 >= 0.0 AND container_volume_cm3 <= 1e+300",
            name=op.f("ck_grain_volume_container_volume_cm3"),
        ),
        sa.CheckConstraint(
            "cup_temperature_degc >= -50.0 AND cup_temperature_degc <= 200.0",
            name=op.f("ck_grain_volume_cup_temperature_degc"),
        ),
        sa.CheckConstraint(
            "expanded_pressure_gauge IN (0, 1) AND (expanded_pressure_gauge IS NULL) = (expanded_pressure_kpa IS NULL)",
            name=op.f("ck_grain_volume_expanded_pressure_gauge"),
        ),
        sa.CheckConstraint(
            "grain_volume_cm3 >= 1e-12 AND grain_volume_cm3 <= 1e+300",
            name=op.f("ck_grain_volume_grain_volume_cm3"),
        ),
        sa.CheckConstraint("length(measured_by) > 0", name=op.f("ck_grain_volume_measured_by")),
        sa.CheckConstraint("length(remarks) > 0", name=op.f("ck_grain_volume_remarks")),
        sa.CheckConstraint(
            "reference_pressure_gauge IN (0, 1) AND (reference_pressure_gauge IS NULL) = (reference_pressure_kpa IS NULL)",
            name=op.f("ck_grain_volume_reference_pressure_gauge"),
        ),
        sa.CheckConstraint("repeat >= 1", name=op.f("ck_grain_volume_repeat")),
        sa.CheckConstraint(
            "temperature_degc >= -50.0 AND temperature_degc <= 1000.0",
            name=op.f("ck_grain_volume_temperature_degc"),
        ),
        sa.ForeignKeyConstraint(["id"], ["entry.id"], name=op.f("fk_grain_volume_id")),
        sa.ForeignKeyConstraint(
            ["instrument_id"], ["instrument.id"], name=op.f("fk_grain_volume_instrument_id")
        ),
        sa.ForeignKeyConstraint(["plug_id"], ["plug.id"], name=op.f("fk_grain_volume_plug_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_grain_volume")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_grain_volume_instrument_id"), "grain_volume", ["instrument_id"], unique=False)
    op.create_index(op.f("ix_grain_volume_plug_id"), "grain_volume", ["plug_id"], unique=False)
    op.create_table(
        "immersion",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("plug_id", sa.Integer(), nullable=False),
        sa.Column("liquid", sa.Text(), nullable=False),
        sa.Column("mass_in_air_g", Real, nullable=True),
        sa.Column("mass_immersed_g", Real, nullable=True),
        sa.Column("mass_displaced_g", Real, nullable=True),
        sa.Column("liquid_density_g_cm3", Real, nullable=True),
        sa.Column("temperature_degc", Real, nullable=True),
        sa.Column("coating_mass_g", Real, nullable=True),
        sa.Column("coating_density_g_cm3", Real, nullable=True),
        sa.Column("balance_id", sa.Integer(), nullable=True),
        sa.Column("measured_on", sa.Text(), nullable=True),
        sa.Column("measured_by", sa.Text(), nullable=True),
        sa.Column("repeat", sa.Integer(), nullable=False),
        sa.Column("remarks", sa.Text(), nullable=True),
        sa.CheckConstraint(
            "liquid IN ('mercury', 'water', 'brine', 'toluene', 'ethanol')", name=op.f("ck_immersion_liquid")
        ),
        sa.CheckConstraint("measured_on LIKE '____-__-__%'", name=op.f("ck_immersion_measured_on")),
        sa.CheckConstraint(
            "(mass_in_air_g IS NOT NULL AND mass_immersed_g IS NOT NULL) OR (mass_displaced_g IS NOT NULL)",
            name=op.f("ck_immersion_either_1"),
        ),
        sa.CheckConstraint(
            "coating_density_g_cm3 >= 0.05 AND coating_density_g_cm3 <= 20.0",
            name=op.f("ck_immersion_coating_density_g_cm3"),
        ),
        sa.CheckConstraint(
            "coating_mass_g >= 0.0 AND coating_mass_g <= 1e+300", name=op.f("ck_immersion_coating_mass_g")
        ),
        sa.CheckConstraint("length(measured_by) > 0", name=op.f("ck_immersion_measured_by")),
        sa.CheckConstraint("length(remarks) > 0", name=op.f("ck_immersion_remarks")),
        sa.CheckConstraint(
            "liquid_density_g_cm3 >= 0.2 AND liquid_density_g_cm3 <= 20.0",
            name=op.f("ck_immersion_liquid_density_g_cm3"),
        ),
        sa.CheckConstraint(
            "mass_displaced_g >= 1e-12 AND mass_displaced_g <= 1e+300",
            name=op.f("ck_immersion_mass_displaced_g"),
        ),
        sa.CheckConstraint(
            "mass_immersed_g >= 0.0 AND mass_immersed_g <= 1e+300", name=op.f("ck_immersion_mass_immersed_g")
        ),
        sa.CheckConstraint(
            "mass_in_air_g >= 1e-12 AND mass_in_air_g <= 1e+300", name=op.f("ck_immersion_mass_in_air_g")
        ),
        sa.CheckConstraint("repeat >= 1", name=op.f("ck_immersion_repeat")),
        sa.CheckConstraint(
            "temperature_degc >= -50.0 AND temperature_degc <= 1000.0",
            name=op.f("ck_immersion_temperature_degc"),
        ),
        sa.ForeignKeyConstraint(["balance_id"], ["instrument.id"], name=op.f("fk_immersion_balance_id")),
        sa.ForeignKeyConstraint(["id"], ["entry.id"], name=op.f("fk_immersion_id")),
        sa.ForeignKeyConstraint(["plug_id"], ["plug.id"], name=op.f("fk_immersion_plug_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_immersion")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_immersion_balance_id"), "immersion", ["balance_id"], unique=False)
    op.create_index(op.f("ix_immersion_plug_id"), "immersion", ["plug_id"], unique=False)
    op.create_table(
        "liquid_permeability",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("plug_id", sa.Integer(), nullable=False),
        sa.Column("step", sa.Text(), nullable=False),
        sa.Column("net_confining_stress_mpa", Real, nullable=True),
        sa.Column("liquid", sa.Text(), nullable=False),
        sa.Column("upstream_pressure_kpa", Real, nullable=False),
        sa.Column("upstream_pressure_gauge", sa.Integer(), nullable=False),
        sa.Column("downstream_pressure_kpa", Real, nullable=True),
        sa.Column("downstream_pressure_gauge", sa.Integer(), nullable=True),
        sa.Column("flow_rate_cm3_per_s", Real, nullable=False),
        sa.Column("viscosity_mpas", Real, nullable=True),
        sa.Column("temperature_degc", Real, nullable=True),
        sa.Column("measured_on", sa.Text(), nullable=True),
        sa.Column("measured_by", sa.Text(), nullable=True),
        sa.Column("repeat", sa.Integer(), nullable=False),
        sa.Column("remarks", sa.Text(), nullable=True),
        sa.CheckConstraint("measured_on LIKE '____-__-__%'", name=op.f("ck_liquid_permeability_measured_on")),
        sa.CheckConstraint(
            "(downstream_pressure_gauge = 1 AND downstream_pressure_kpa >= -120.0 AND downstream_pressure_kpa <= 1e+300) OR (downstream_pressure_kpa >= 1e-12 AND downstream_pressure_kpa <= 1e+300)",
            name=op.f("ck_liquid_permeability_downstream_pressure_kpa"),
        ),
        sa.CheckConstraint(
            "(upstream_pressure_gauge = 1 AND upstream_pressure_kpa >= -120.0 AND upstream_pressure_kpa <= 1e+300) OR (upstream_pressure_kpa >= 1e-12 AND upstream_pressure_kpa <= 1e+300)",
            name=op.f("ck_liquid_permeability_upstream_pressure_kpa"),
        ),
        sa.CheckConstraint(
            "downstream_pressure_gauge IN (0, 1) AND (downstream_pressure_gauge IS NULL) = (downstream_pressure_kpa IS NULL)",
            name=op.f("ck_liquid_permeability_downstream_pressure_gauge"),
        ),
        sa.CheckConstraint(
            "flow_rate_cm3_per_s >= 1e-12 AND flow_rate_cm3_per_s <= 1e+300",
            name=op.f("ck_liquid_permeability_flow_rate_cm3_per_s"),
        ),
        sa.CheckConstraint("length(liquid) > 0", name=op.f("ck_liquid_permeability_liquid")),
        sa.CheckConstraint("length(measured_by) > 0", name=op.f("ck_liquid_permeability_measured_by")),
        sa.CheckConstraint("length(remarks) > 0", name=op.f("ck_liquid_permeability_remarks")),
        sa.CheckConstraint("length(step) > 0", name=op.f("ck_liquid_permeability_step")),
        sa.CheckConstraint(
            "net_confining_stress_mpa >= 0.0 AND net_confining_stress_mpa <= 500.0",
            name=op.f("ck_liquid_permeability_net_confining_stress_mpa"),
        ),
        sa.CheckConstraint("repeat >= 1", name=op.f("ck_liquid_permeability_repeat")),
        sa.CheckConstraint(
            "temperature_degc >= -50.0 AND temperature_degc <= 1000.0",
            name=op.f("ck_liquid_permeability_temperature_degc"),
        ),
        sa.CheckConstraint(
            "upstream_pressure_gauge IN (0, 1) AND (upstream_pressure_gauge IS NULL) = (upstream_pressure_kpa IS NULL)",
            name=op.f("ck_liquid_permeability_upstream_pressure_gauge"),
        ),
        sa.CheckConstraint(
            "viscosity_mpas >= 1e-12 AND viscosity_mpas <= 1e+300",
            name=op.f("ck_liquid_permeability_viscosity_mpas"),
        ),
        sa.ForeignKeyConstraint(["id"], ["entry.id"], name=op.f("fk_liquid_permeability_id")),
        sa.ForeignKeyConstraint(["plug_id"], ["plug.id"], name=op.f("fk_liquid_permeability_plug_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_liquid_permeability")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_liquid_permeability_plug_id"), "liquid_permeability", ["plug_id"], unique=False)
    op.create_table(
        "masses",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("plug_id", sa.Integer(), nullable=False),
        sa.Column("condition", sa.Text(), nullable=False),
        sa.Column("mass_g", Real, nullable=False),
        sa.Column("container_mass_g", Real, nullable=True),
        sa.Column("saturant_density_g_cm3", Real, nullable=True),
        sa.Column("salinity_g_per_kg", Real, nullable=True),
        sa.Column("salt", sa.Text(), nullable=False),
        sa.Column("salt_density_g_cm3", Real, nullable=True),
        sa.Column("balance_id", sa.Integer(), nullable=True),
        sa.Column("measured_on", sa.Text(), nullable=True),
        sa.Column("measured_by", sa.Text(), nullable=True),
        sa.Column("repeat", sa.Integer(), nullable=False),
        sa.Column("remarks", sa.Text(), nullable=True),
        sa.CheckConstraint(
            "condition IN ('as received', 'dry', 'saturated')", name=op.f("ck_masses_condition")
        ),
        sa.CheckConstraint("measured_on LIKE '____-__-__%'", name=op.f("ck_masses_measured_on")),
        sa.CheckConstraint("salt IN ('none', 'left', 'leached')", name=op.f("ck_masses_salt")),
        sa.CheckConstraint(
            "container_mass_g >= 0.0 AND container_mass_g <= 1e+300", name=op.f("ck_masses_container_mass_g")
        ),
        sa.CheckConstraint("length(measured_by) > 0", name=op.f("ck_masses_measured_by")),
        sa.CheckConstraint("length(remarks) > 0", name=op.f("ck_masses_remarks")),
        sa.CheckConstraint("mass_g >= 1e-12 AND mass_g <= 1e+300", name=op.f("ck_masses_mass_g")),
        sa.CheckConstraint("repeat >= 1", name=op.f("ck_masses_repeat")),
        sa.CheckConstraint(
            "salinity_g_per_kg >= 0.0 AND salinity_g_per_kg <= 400.0",
            name=op.f("ck_masses_salinity_g_per_kg"),
        ),
        sa.CheckConstraint(
            "salt_density_g_cm3 >= 1.0 AND salt_density_g_cm3 <= 6.0",
            name=op.f("ck_masses_salt_density_g_cm3"),
        ),
        sa.CheckConstraint(
            "saturant_density_g_cm3 >= 0.2 AND saturant_density_g_cm3 <= 3.0",
            name=op.f("ck_masses_saturant_density_g_cm3"),
        ),
        sa.ForeignKeyConstraint(["balance_id"], ["instrument.id"], name=op.f("fk_masses_balance_id")),
        sa.ForeignKeyConstraint(["id"], ["entry.id"], name=op.f("fk_masses_id")),
        sa.ForeignKeyConstraint(["plug_id"], ["plug.id"], name=op.f("fk_masses_plug_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_masses")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_masses_balance_id"), "masses", ["balance_id"], unique=False)
    op.create_index(op.f("ix_masses_plug_id"), "masses", ["plug_id"], unique=False)
    op.create_table(
        "not_measured",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("plug_id", sa.Integer(), nullable=False),
        sa.Column("test", sa.Text(), nullable=False),
        sa.Column("reason", sa.Text(), nullable=False),
        sa.Column("remarks", sa.Text(), nullable=True),
        sa.CheckConstraint(
            "reason IN ('fractured', 'too short', 'crumbled', 'preserved', 'unsuitable', 'lost')",
            name=op.f("ck_not_measured_reason"),
        ),
        sa.CheckConstraint(
            "test IN ('bulk volume', 'grain volume', 'pore volume', 'porosity', 'permeability', 'gas permeability', 'klinkenberg permeability', 'liquid permeability', 'saturations', 'distillation', 'retort', 'sieve', 'dimensions', 'immersion', 'masses')",
            name=op.f("ck_not_measured_test"),
        ),
        sa.CheckConstraint("length(remarks) > 0", name=op.f("ck_not_measured_remarks")),
        sa.ForeignKeyConstraint(["id"], ["entry.id"], name=op.f("fk_not_measured_id")),
        sa.ForeignKeyConstraint(["plug_id"], ["plug.id"], name=op.f("fk_not_measured_plug_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_not_measured")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_not_measured_plug_id"), "not_measured", ["plug_id"], unique=False)
    op.create_table(
        "plugs",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("plug_id", sa.Integer(), nullable=False),
        sa.Column("from", sa.Text(), nullable=False),
        sa.Column("run_id", sa.Integer(), nullable=True),
        sa.Column("gun_run_id", sa.Integer(), nullable=True),
        sa.Column("shot", sa.Text(), nullable=True),
        sa.Column("depth_m", Real, nullable=False),
        sa.Column("top_depth_m", Real, nullable=True),
        sa.Column("base_depth_m", Real, nullable=True),
        sa.Column("orientation", sa.Text(), nullable=True),
        sa.Column("azimuth_deg", Real, nullable=True),
        sa.Column("companion_of_id", sa.Integer(), nullable=True),
        sa.Column("duplicate_of_id", sa.Integer(), nullable=True),
        sa.Column("facies", sa.Text(), nullable=True),
        sa.Column("jacket_mass_g", Real, nullable=True),
        sa.Column("jacket_volume_cm3", Real, nullable=True),
        sa.Column("screen_thickness_cm", Real, nullable=True),
        sa.Column("taken_on", sa.Text(), nullable=True),
        sa.Column("location", sa.Text(), nullable=True),
        sa.Column("priority", sa.Text(), nullable=False),
        sa.Column("remarks", sa.Text(), nullable=True),
        sa.CheckConstraint(
            "orientation IN ('horizontal', 'vertical', 'oblique')", name=op.f("ck_plugs_orientation")
        ),
        sa.CheckConstraint("priority IN ('normal', 'rush')", name=op.f("ck_plugs_priority")),
        sa.CheckConstraint("taken_on LIKE '____-__-__%'", name=op.f("ck_plugs_taken_on")),
        sa.CheckConstraint("\"from\" IN ('core', 'sidewall', 'whole core')", name=op.f("ck_plugs_from")),
        sa.CheckConstraint(
            "azimuth_deg >= -360.0 AND azimuth_deg <= 360.0", name=op.f("ck_plugs_azimuth_deg")
        ),
        sa.CheckConstraint(
            "base_depth_m >= -500.0 AND base_depth_m <= 15000.0", name=op.f("ck_plugs_base_depth_m")
        ),
        sa.CheckConstraint("depth_m >= -500.0 AND depth_m <= 15000.0", name=op.f("ck_plugs_depth_m")),
        sa.CheckConstraint(
            "jacket_mass_g >= 0.0 AND jacket_mass_g <= 1e+300", name=op.f("ck_plugs_jacket_mass_g")
        ),
        sa.CheckConstraint(
            "jacket_volume_cm3 >= 0.0 AND jacket_volume_cm3 <= 1e+300",
            name=op.f("ck_plugs_jacket_volume_cm3"),
        ),
        sa.CheckConstraint("length(facies) > 0", name=op.f("ck_plugs_facies")),
        sa.CheckConstraint("length(location) > 0", name=op.f("ck_plugs_location")),
        sa.CheckConstraint("length(remarks) > 0", name=op.f("ck_plugs_remarks")),
        sa.CheckConstraint("length(shot) > 0", name=op.f("ck_plugs_shot")),
        sa.CheckConstraint(
            "screen_thickness_cm >= 0.0 AND screen_thickness_cm <= 5.0",
            name=op.f("ck_plugs_screen_thickness_cm"),
        ),
        sa.CheckConstraint(
            "top_depth_m >= -500.0 AND top_depth_m <= 15000.0", name=op.f("ck_plugs_top_depth_m")
        ),
        sa.ForeignKeyConstraint(["companion_of_id"], ["plug.id"], name=op.f("fk_plugs_companion_of_id")),
        sa.ForeignKeyConstraint(["duplicate_of_id"], ["plug.id"], name=op.f("fk_plugs_duplicate_of_id")),
        sa.ForeignKeyConstraint(["gun_run_id"], ["gun_run.id"], name=op.f("fk_plugs_gun_run_id")),
        sa.ForeignKeyConstraint(["id"], ["entry.id"], name=op.f("fk_plugs_id")),
        sa.ForeignKeyConstraint(["plug_id"], ["plug.id"], name=op.f("fk_plugs_plug_id")),
        sa.ForeignKeyConstraint(["run_id"], ["run.id"], name=op.f("fk_plugs_run_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_plugs")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_plugs_companion_of_id"), "plugs", ["companion_of_id"], unique=False)
    op.create_index(op.f("ix_plugs_duplicate_of_id"), "plugs", ["duplicate_of_id"], unique=False)
    op.create_index(op.f("ix_plugs_gun_run_id"), "plugs", ["gun_run_id"], unique=False)
    op.create_index(op.f("ix_plugs_plug_id"), "plugs", ["plug_id"], unique=False)
    op.create_index(op.f("ix_plugs_run_id"), "plugs", ["run_id"], unique=False)
    op.create_table(
        "pore_volume",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("plug_id", sa.Integer(), nullable=False),
        sa.Column("net_confining_stress_mpa", Real, nullable=False),
        sa.Column("instrument_id", sa.Integer(), nullable=False),
        sa.Column("reference_pressure_kpa", Real, nullable=False),
        sa.Column("reference_pressure_gauge", sa.Integer(), nullable=False),
        sa.Column("expanded_pressure_kpa", Real, nullable=False),
        sa.Column("expanded_pressure_gauge", sa.Integer(), nullable=False),
        sa.Column("barometric_pressure_kpa", Real, nullable=True),
        sa.Column("temperature_degc", Real, nullable=True),
        sa.Column("measured_on", sa.Text(), nullable=True),
        sa.Column("measured_by", sa.Text(), nullable=True),
        sa.Column("repeat", sa.Integer(), nullable=False),
        sa.Column("remarks", sa.Text(), nullable=True),
        sa.CheckConstraint("measured_on LIKE '____-__-__%'", name=op.f("ck_pore_volume_measured_on")),
        sa.CheckConstraint(
            "(expanded_pressure_gauge = 1 AND expanded_pressure_kpa >= -120.0 AND expanded_pressure_kpa <= 1e+300) OR (expanded_pressure_kpa >= 1e-12 AND expanded_pressure_kpa <= 1e+300)",
            name=op.f("ck_pore_volume_expanded_pressure_kpa"),
        ),
        sa.CheckConstraint(
            "(reference_pressure_gauge = 1 AND reference_pressure_kpa >= -120.0 AND reference_pressure_kpa <= 1e+300) OR (reference_pressure_kpa >= 1e-12 AND reference_pressure_kpa <= 1e+300)",
            name=op.f("ck_pore_volume_reference_pressure_kpa"),
        ),
        sa.CheckConstraint(
            "barometric_pressure_kpa >= 40.0 AND barometric_pressure_kpa <= 120.0",
            name=op.f("ck_pore_volume_barometric_pressure_kpa"),
        ),
        sa.CheckConstraint(
            "expanded_pressure_gauge IN (0, 1) AND (expanded_pressure_gauge IS NULL) = (expanded_pressure_kpa IS NULL)",
            name=op.f("ck_pore_volume_expanded_pressure_gauge"),
        ),
        sa.CheckConstraint("length(measured_by) > 0", name=op.f("ck_pore_volume_measured_by")),
        sa.CheckConstraint("length(remarks) > 0", name=op.f("ck_pore_volume_remarks")),
        sa.CheckConstraint(
            "net_confining_stress_mpa >= 0.0 AND net_confining_stress_mpa <= 500.0",
            name=op.f("ck_pore_volume_net_confining_stress_mpa"),
        ),
        sa.CheckConstraint(
            "reference_pressure_gauge IN (0, 1) AND (reference_pressure_gauge IS NULL) = (reference_pressure_kpa IS NULL)",
            name=op.f("ck_pore_volume_reference_pressure_gauge"),
        ),
        sa.CheckConstraint("repeat >= 1", name=op.f("ck_pore_volume_repeat")),
        sa.CheckConstraint(
            "temperature_degc >= -50.0 AND temperature_degc <= 1000.0",
            name=op.f("ck_pore_volume_temperature_degc"),
        ),
        sa.ForeignKeyConstraint(["id"], ["entry.id"], name=op.f("fk_pore_volume_id")),
        sa.ForeignKeyConstraint(
            ["instrument_id"], ["instrument.id"], name=op.f("fk_pore_volume_instrument_id")
        ),
        sa.ForeignKeyConstraint(["plug_id"], ["plug.id"], name=op.f("fk_pore_volume_plug_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_pore_volume")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_pore_volume_instrument_id"), "pore_volume", ["instrument_id"], unique=False)
    op.create_index(op.f("ix_pore_volume_plug_id"), "pore_volume", ["plug_id"], unique=False)
    op.create_table(
        "reported_permeability",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("plug_id", sa.Integer(), nullable=False),
        sa.Column("direction", sa.Text(), nullable=False),
        sa.Column("net_confining_stress_mpa", Real, nullable=True),
        sa.Column("permeameter_id", sa.Integer(), nullable=False),
        sa.Column("klinkenberg_permeability_md", Real, nullable=True),
        sa.Column("klinkenberg_permeability_limit", sa.Text(), nullable=True),
        sa.Column("gas_permeability_md", Real, nullable=True),
        sa.Column("gas_permeability_limit", sa.Text(), nullable=True),
        sa.Column("gas", sa.Text(), nullable=True),
        sa.Column("mean_pressure_kpa", Real, nullable=True),
        sa.Column("slip_factor_kpa", Real, nullable=True),
        sa.Column("inertial_coefficient_per_m", Real, nullable=True),
        sa.Column("measured_on", sa.Text(), nullable=True),
        sa.Column("measured_by", sa.Text(), nullable=True),
        sa.Column("repeat", sa.Integer(), nullable=False),
        sa.Column("remarks", sa.Text(), nullable=True),
        sa.CheckConstraint(
            "direction IN ('axial', 'max', '90', 'vertical')", name=op.f("ck_reported_permeability_direction")
        ),
        sa.CheckConstraint("gas IN ('nitrogen', 'helium', 'air')", name=op.f("ck_reported_permeability_gas")),
        sa.CheckConstraint(
            "gas_permeability_limit IS NULL OR (gas_permeability_limit IN ('below', 'above') AND gas_permeability_md IS NOT NULL)",
            name=op.f("ck_reported_permeability_gas_permeability_limit"),
        ),
        sa.CheckConstraint(
            "klinkenberg_permeability_limit IS NULL OR (klinkenberg_permeability_limit IN ('below', 'above') AND klinkenberg_permeability_md IS NOT NULL)",
            name=op.f("ck_reported_permeability_klinkenberg_permeability_limit"),
        ),
        sa.CheckConstraint(
            "measured_on LIKE '____-__-__%'", name=op.f("ck_reported_permeability_measured_on")
        ),
        sa.CheckConstraint(
            "(klinkenberg_permeability_md IS NOT NULL) OR (gas_permeability_md IS NOT NULL)",
            name=op.f("ck_reported_permeability_either_1"),
        ),
        sa.CheckConstraint(
            "gas_permeability_md >= 1e-12 AND gas_permeability_md <= 1e+300",
            name=op.f("ck_reported_permeability_gas_permeability_md"),
        ),
        sa.CheckConstraint(
            "inertial_coefficient_per_m >= 0.0 AND inertial_coefficient_per_m <= 1e+300",
            name=op.f("ck_reported_permeability_inertial_coefficient_per_m"),
        ),
        sa.CheckConstraint(
            "klinkenberg_permeability_md >= 1e-12 AND klinkenberg_permeability_md <= 1e+300",
            name=op.f("ck_reported_permeability_klinkenberg_permeability_md"),
        ),
        sa.CheckConstraint("length(measured_by) > 0", name=op.f("ck_reported_permeability_measured_by")),
        sa.CheckConstraint("length(remarks) > 0", name=op.f("ck_reported_permeability_remarks")),
        sa.CheckConstraint(
            "mean_pressure_kpa >= 1e-12 AND mean_pressure_kpa <= 1e+300",
            name=op.f("ck_reported_permeability_mean_pressure_kpa"),
        ),
        sa.CheckConstraint(
            "net_confining_stress_mpa >= 0.0 AND net_confining_stress_mpa <= 500.0",
            name=op.f("ck_reported_permeability_net_confining_stress_mpa"),
        ),
        sa.CheckConstraint("repeat >= 1", name=op.f("ck_reported_permeability_repeat")),
        sa.CheckConstraint(
            "slip_factor_kpa >= 0.0 AND slip_factor_kpa <= 1e+300",
            name=op.f("ck_reported_permeability_slip_factor_kpa"),
        ),
        sa.ForeignKeyConstraint(["id"], ["entry.id"], name=op.f("fk_reported_permeability_id")),
        sa.ForeignKeyConstraint(
            ["permeameter_id"], ["instrument.id"], name=op.f("fk_reported_permeability_permeameter_id")
        ),
        sa.ForeignKeyConstraint(["plug_id"], ["plug.id"], name=op.f("fk_reported_permeability_plug_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_reported_permeability")),
        sqlite_strict=True,
    )
    op.create_index(
        op.f("ix_reported_permeability_permeameter_id"),
        "reported_permeability",
        ["permeameter_id"],
        unique=False,
    )
    op.create_index(
        op.f("ix_reported_permeability_plug_id"), "reported_permeability", ["plug_id"], unique=False
    )
    op.create_table(
        "result",
        sa.Column("plug_id", sa.Integer(), nullable=False),
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
        sa.CheckConstraint("value_limit IN ('below', 'above')", name=op.f("ck_result_value_limit")),
        sa.CheckConstraint("value IS NOT NULL OR length(reason) > 0", name=op.f("ck_result_value")),
        sa.ForeignKeyConstraint(["plug_id"], ["plug.id"], name=op.f("fk_result_plug_id")),
        sa.PrimaryKeyConstraint(
            "plug_id", "quantity", "direction", "stress_mpa", "step", name=op.f("pk_result")
        ),
        sqlite_strict=True,
    )
    op.create_table(
        "retort",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("plug_id", sa.Integer(), nullable=False),
        sa.Column("sample_mass_g", Real, nullable=False),
        sa.Column("sample_bulk_volume_cm3", Real, nullable=False),
        sa.Column("water_volume_cm3", Real, nullable=False),
        sa.Column("oil_volume_cm3", Real, nullable=False),
        sa.Column("gas_sample_mass_g", Real, nullable=True),
        sa.Column("gas_sample_bulk_volume_cm3", Real, nullable=True),
        sa.Column("gas_volume_cm3", Real, nullable=True),
        sa.Column("oil_density_g_cm3", Real, nullable=True),
        sa.Column("measured_on", sa.Text(), nullable=True),
        sa.Column("measured_by", sa.Text(), nullable=True),
        sa.Column("repeat", sa.Integer(), nullable=False),
        sa.Column("remarks", sa.Text(), nullable=True),
        sa.CheckConstraint("measured_on LIKE '____-__-__%'", name=op.f("ck_retort_measured_on")),
        sa.CheckConstraint(
            "gas_sample_bulk_volume_cm3 >= 1e-12 AND gas_sample_bulk_volume_cm3 <= 1e+300",
            name=op.f("ck_retort_gas_sample_bulk_volume_cm3"),
        ),
        sa.CheckConstraint(
            "gas_sample_mass_g >= 1e-12 AND gas_sample_mass_g <= 1e+300",
            name=op.f("ck_retort_gas_sample_mass_g"),
        ),
        sa.CheckConstraint(
            "gas_volume_cm3 >= 0.0 AND gas_volume_cm3 <= 1e+300", name=op.f("ck_retort_gas_volume_cm3")
        ),
        sa.CheckConstraint("length(measured_by) > 0", name=op.f("ck_retort_measured_by")),
        sa.CheckConstraint("length(remarks) > 0", name=op.f("ck_retort_remarks")),
        sa.CheckConstraint(
            "oil_density_g_cm3 >= 0.3 AND oil_density_g_cm3 <= 1.5", name=op.f("ck_retort_oil_density_g_cm3")
        ),
        sa.CheckConstraint(
            "oil_volume_cm3 >= 0.0 AND oil_volume_cm3 <= 1e+300", name=op.f("ck_retort_oil_volume_cm3")
        ),
        sa.CheckConstraint("repeat >= 1", name=op.f("ck_retort_repeat")),
        sa.CheckConstraint(
            "sample_bulk_volume_cm3 >= 1e-12 AND sample_bulk_volume_cm3 <= 1e+300",
            name=op.f("ck_retort_sample_bulk_volume_cm3"),
        ),
        sa.CheckConstraint(
            "sample_mass_g >= 1e-12 AND sample_mass_g <= 1e+300", name=op.f("ck_retort_sample_mass_g")
        ),
        sa.CheckConstraint(
            "water_volume_cm3 >= 0.0 AND water_volume_cm3 <= 1e+300", name=op.f("ck_retort_water_volume_cm3")
        ),
        sa.ForeignKeyConstraint(["id"], ["entry.id"], name=op.f("fk_retort_id")),
        sa.ForeignKeyConstraint(["plug_id"], ["plug.id"], name=op.f("fk_retort_plug_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_retort")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_retort_plug_id"), "retort", ["plug_id"], unique=False)
    op.create_table(
        "sidewall_shots",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("gun_run_id", sa.Integer(), nullable=False),
        sa.Column("shot", sa.Text(), nullable=False),
        sa.Column("depth_m", Real, nullable=False),
        sa.Column("depth_basis", sa.Text(), nullable=False),
        sa.Column("tool", sa.Text(), nullable=False),
        sa.Column("outcome", sa.Text(), nullable=False),
        sa.Column("recovered_length_mm", Real, nullable=True),
        sa.Column("bullet", sa.Text(), nullable=True),
        sa.Column("charge", sa.Text(), nullable=True),
        sa.Column("remarks", sa.Text(), nullable=True),
        sa.CheckConstraint("depth_basis IN ('log', 'driller')", name=op.f("ck_sidewall_shots_depth_basis")),
        sa.CheckConstraint(
            "outcome IN ('recovered', 'partial', 'misfired', 'lost', 'empty', 'not attempted')",
            name=op.f("ck_sidewall_shots_outcome"),
        ),
        sa.CheckConstraint("tool IN ('percussion', 'rotary')", name=op.f("ck_sidewall_shots_tool")),
        sa.CheckConstraint(
            "depth_m >= -500.0 AND depth_m <= 15000.0", name=op.f("ck_sidewall_shots_depth_m")
        ),
        sa.CheckConstraint("length(bullet) > 0", name=op.f("ck_sidewall_shots_bullet")),
        sa.CheckConstraint("length(charge) > 0", name=op.f("ck_sidewall_shots_charge")),
        sa.CheckConstraint("length(remarks) > 0", name=op.f("ck_sidewall_shots_remarks")),
        sa.CheckConstraint("length(shot) > 0", name=op.f("ck_sidewall_shots_shot")),
        sa.CheckConstraint(
            "recovered_length_mm >= 0.0 AND recovered_length_mm <= 500.0",
            name=op.f("ck_sidewall_shots_recovered_length_mm"),
        ),
        sa.ForeignKeyConstraint(["gun_run_id"], ["gun_run.id"], name=op.f("fk_sidewall_shots_gun_run_id")),
        sa.ForeignKeyConstraint(["id"], ["entry.id"], name=op.f("fk_sidewall_shots_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_sidewall_shots")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_sidewall_shots_gun_run_id"), "sidewall_shots", ["gun_run_id"], unique=False)
    op.create_table(
        "sieve",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("plug_id", sa.Integer(), nullable=False),
        sa.Column("aperture_mm", Real, nullable=False),
        sa.Column("mass_retained_g", Real, nullable=False),
        sa.Column("measured_on", sa.Text(), nullable=True),
        sa.Column("measured_by", sa.Text(), nullable=True),
        sa.Column("repeat", sa.Integer(), nullable=False),
        sa.Column("remarks", sa.Text(), nullable=True),
        sa.CheckConstraint("measured_on LIKE '____-__-__%'", name=op.f("ck_sieve_measured_on")),
        sa.CheckConstraint("aperture_mm >= 0.0 AND aperture_mm <= 4096.0", name=op.f("ck_sieve_aperture_mm")),
        sa.CheckConstraint("length(measured_by) > 0", name=op.f("ck_sieve_measured_by")),
        sa.CheckConstraint("length(remarks) > 0", name=op.f("ck_sieve_remarks")),
        sa.CheckConstraint(
            "mass_retained_g >= 0.0 AND mass_retained_g <= 1e+300", name=op.f("ck_sieve_mass_retained_g")
        ),
        sa.CheckConstraint("repeat >= 1", name=op.f("ck_sieve_repeat")),
        sa.ForeignKeyConstraint(["id"], ["entry.id"], name=op.f("fk_sieve_id")),
        sa.ForeignKeyConstraint(["plug_id"], ["plug.id"], name=op.f("fk_sieve_plug_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_sieve")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_sieve_plug_id"), "sieve", ["plug_id"], unique=False)
    op.create_table(
        "standards",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("standard_id", sa.Integer(), nullable=False),
        sa.Column("kind", sa.Text(), nullable=False),
        sa.Column("maker", sa.Text(), nullable=True),
        sa.Column("certificate", sa.Text(), nullable=True),
        sa.Column("valid_until", sa.Text(), nullable=True),
        sa.Column("remarks", sa.Text(), nullable=True),
        sa.CheckConstraint("kind IN ('check plug', 'billet', 'void')", name=op.f("ck_standards_kind")),
        sa.CheckConstraint("valid_until LIKE '____-__-__%'", name=op.f("ck_standards_valid_until")),
        sa.CheckConstraint("length(certificate) > 0", name=op.f("ck_standards_certificate")),
        sa.CheckConstraint("length(maker) > 0", name=op.f("ck_standards_maker")),
        sa.CheckConstraint("length(remarks) > 0", name=op.f("ck_standards_remarks")),
        sa.ForeignKeyConstraint(["id"], ["entry.id"], name=op.f("fk_standards_id")),
        sa.ForeignKeyConstraint(["standard_id"], ["plug.id"], name=op.f("fk_standards_standard_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_standards")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_standards_standard_id"), "standards", ["standard_id"], unique=False)
    op.create_table(
        "treatments",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("plug_id", sa.Integer(), nullable=False),
        sa.Column("step", sa.Text(), nullable=False),
        sa.Column("method", sa.Text(), nullable=True),
        sa.Column("solvent", sa.Text(), nullable=True),
        sa.Column("temperature_degc", Real, nullable=True),
        sa.Column("humidity_frac", Real, nullable=True),
        sa.Column("started_on", sa.Text(), nullable=True),
        sa.Column("ended_on", sa.Text(), nullable=True),
        sa.Column("end_point", sa.Text(), nullable=True),
        sa.Column("remarks", sa.Text(), nullable=True),
        sa.CheckConstraint("ended_on LIKE '____-__-__%'", name=op.f("ck_treatments_ended_on")),
        sa.CheckConstraint(
            "method IN ('distillation', 'flow-through', 'centrifuge', 'oven', 'vacuum oven', 'humidity oven')",
            name=op.f("ck_treatments_method"),
        ),
        sa.CheckConstraint("started_on LIKE '____-__-__%'", name=op.f("ck_treatments_started_on")),
        sa.CheckConstraint("step IN ('cleaning', 'drying')", name=op.f("ck_treatments_step")),
        sa.CheckConstraint(
            "humidity_frac >= 0.0 AND humidity_frac <= 1.0", name=op.f("ck_treatments_humidity_frac")
        ),
        sa.CheckConstraint("length(end_point) > 0", name=op.f("ck_treatments_end_point")),
        sa.CheckConstraint("length(remarks) > 0", name=op.f("ck_treatments_remarks")),
        sa.CheckConstraint("length(solvent) > 0", name=op.f("ck_treatments_solvent")),
        sa.CheckConstraint(
            "temperature_degc >= -200.0 AND temperature_degc <= 1000.0",
            name=op.f("ck_treatments_temperature_degc"),
        ),
        sa.ForeignKeyConstraint(["id"], ["entry.id"], name=op.f("fk_treatments_id")),
        sa.ForeignKeyConstraint(["plug_id"], ["plug.id"], name=op.f("fk_treatments_plug_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_treatments")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_treatments_plug_id"), "treatments", ["plug_id"], unique=False)


def downgrade() -> None:
    raise RuntimeError("a record of readings is never downgraded: restore the backup made before the upgrade")
