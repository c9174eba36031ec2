"""First tables: sealed files, cooldowns, accessions with all that came in, reductions with all that came out.

The types stand here once more, since a migration says what was, and the models say what is.
"""

from __future__ import annotations

import sqlalchemy as sa
from alembic import op
from sqlalchemy.dialects import postgresql, sqlite

revision = "0001"
down_revision = None
branch_labels = None
depends_on = None

TEXT = sa.Text().with_variant(postgresql.TEXT(collation="C"), "postgresql")
REAL: sa.types.TypeEngine[float] = sa.Double().with_variant(sqlite.REAL(), "sqlite")
COUNT = sa.BigInteger().with_variant(sa.Integer(), "sqlite")
FLAG = sa.Integer()

TABLES = (
    "cooldown",
    "plan",
    "sealed_file",
    "accession",
    "finding",
    "reduction",
    "dose",
    "output",
    "raw_file",
    "record",
    "reduction_input",
    "step",
    "sweep",
    "channel",
    "sweep_thermometer",
)
"""In the order in which they are made: what is referred to comes first."""


def upgrade() -> None:
    """Make the tables."""
    op.create_table(
        "cooldown",
        sa.Column("name", TEXT, nullable=False),
        sa.Column("newest", COUNT, nullable=True),
        sa.Column("begin", TEXT, nullable=True),
        sa.Column("end", TEXT, nullable=True),
        sa.Column("outcome", TEXT, nullable=True),
        sa.Column("purpose", TEXT, nullable=True),
        sa.Column("next_step", TEXT, nullable=True),
        sa.Column("cryostat", TEXT, nullable=True),
        sa.Column("cell", TEXT, nullable=True),
        sa.Column("licence", TEXT, nullable=True),
        sa.PrimaryKeyConstraint("name", name=op.f("pk_cooldown")),
        sqlite_strict=True,
    )
    op.create_table(
        "plan",
        sa.Column("address", TEXT, nullable=False),
        sa.Column("digest", TEXT, nullable=False),
        sa.Column("name", TEXT, nullable=False),
        sa.Column("revision", COUNT, nullable=False),
        sa.Column("title", TEXT, nullable=False),
        sa.Column("content", TEXT, nullable=False),
        sa.PrimaryKeyConstraint("address", "digest", name=op.f("pk_plan")),
        sqlite_strict=True,
    )
    op.create_table(
        "sealed_file",
        sa.Column("key", TEXT, nullable=False),
        sa.Column("document", TEXT, nullable=False),
        sa.Column("address", TEXT, nullable=False),
        sa.Column("sha256", TEXT, nullable=False),
        sa.Column("size", COUNT, nullable=False),
        sa.CheckConstraint("document IN ('accession', 'reduction')", name=op.f("ck_sealed_file_document")),
        sa.PrimaryKeyConstraint("key", name=op.f("pk_sealed_file")),
        sa.UniqueConstraint("address", name=op.f("uq_sealed_file_address")),
        sqlite_strict=True,
    )
    op.create_table(
        "accession",
        sa.Column("address", TEXT, nullable=False),
        sa.Column("cooldown", TEXT, nullable=False),
        sa.Column("number", COUNT, nullable=False),
        sa.Column("key", TEXT, nullable=False),
        sa.Column("accessioned", TEXT, nullable=False),
        sa.Column("supplements", TEXT, nullable=True),
        sa.Column("sheet_file", TEXT, nullable=False),
        sa.Column("differences", TEXT, nullable=False),
        sa.Column("stillroom", TEXT, nullable=False),
        sa.ForeignKeyConstraint(["cooldown"], ["cooldown.name"], name=op.f("fk_accession_cooldown")),
        sa.ForeignKeyConstraint(["key"], ["sealed_file.key"], name=op.f("fk_accession_key")),
        sa.PrimaryKeyConstraint("address", name=op.f("pk_accession")),
        sa.UniqueConstraint("cooldown", "number", name=op.f("uq_accession_cooldown_number")),
        sa.UniqueConstraint("key", name=op.f("uq_accession_key")),
        sqlite_strict=True,
    )
    op.create_table(
        "finding",
        sa.Column("key", TEXT, nullable=False),
        sa.Column("step", COUNT, nullable=False),
        sa.Column("position", COUNT, nullable=False),
        sa.Column("code", TEXT, nullable=False),
        sa.Column("severity", TEXT, nullable=False),
        sa.Column("what", TEXT, nullable=False),
        sa.Column("place", TEXT, nullable=True),
        sa.Column("waived", FLAG, nullable=False),
        sa.Column("content", TEXT, nullable=False),
        sa.ForeignKeyConstraint(["key"], ["sealed_file.key"], name=op.f("fk_finding_key")),
        sa.PrimaryKeyConstraint("key", "step", "position", name=op.f("pk_finding")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_finding_code"), "finding", ["code"], unique=False)
    op.create_table(
        "reduction",
        sa.Column("address", TEXT, nullable=False),
        sa.Column("key", TEXT, nullable=False),
        sa.Column("cooldown", TEXT, nullable=False),
        sa.Column("sweep", TEXT, nullable=False),
        sa.Column("plan", TEXT, nullable=False),
        sa.Column("number", COUNT, nullable=False),
        sa.Column("plan_address", TEXT, nullable=False),
        sa.Column("plan_digest", TEXT, nullable=False),
        sa.Column("supersedes", TEXT, nullable=True),
        sa.Column("begin", TEXT, nullable=False),
        sa.Column("end", TEXT, nullable=False),
        sa.Column("stillroom", TEXT, nullable=False),
        sa.ForeignKeyConstraint(["cooldown"], ["cooldown.name"], name=op.f("fk_reduction_cooldown")),
        sa.ForeignKeyConstraint(["key"], ["sealed_file.key"], name=op.f("fk_reduction_key")),
        sa.ForeignKeyConstraint(
            ["plan_address", "plan_digest"],
            ["plan.address", "plan.digest"],
            name=op.f("fk_reduction_plan_address_plan_digest"),
        ),
        sa.PrimaryKeyConstraint("address", name=op.f("pk_reduction")),
        sa.UniqueConstraint("key", name=op.f("uq_reduction_key")),
        sa.UniqueConstraint("sweep", "plan", "number", name=op.f("uq_reduction_sweep_plan_number")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_reduction_plan_cooldown"), "reduction", ["plan", "cooldown"], unique=False)
    op.create_index(op.f("ix_reduction_supersedes"), "reduction", ["supersedes"], unique=False)
    op.create_table(
        "dose",
        sa.Column("accession", TEXT, nullable=False),
        sa.Column("name", TEXT, nullable=False),
        sa.Column("position", COUNT, nullable=False),
        sa.Column("at", TEXT, nullable=False),
        sa.Column("act", TEXT, nullable=False),
        sa.Column("counted", FLAG, nullable=False),
        sa.Column("amount_mol", REAL, nullable=True),
        sa.Column("amount_uncertainty_mol", REAL, nullable=True),
        sa.Column("running_amount_mol", REAL, nullable=True),
        sa.Column("running_amount_uncertainty_mol", REAL, nullable=True),
        sa.Column("running_coverage_mol_per_m2", REAL, nullable=True),
        sa.Column("running_coverage_uncertainty_mol_per_m2", REAL, nullable=True),
        sa.Column("method", TEXT, nullable=False),
        sa.ForeignKeyConstraint(["accession"], ["accession.address"], name=op.f("fk_dose_accession")),
        sa.PrimaryKeyConstraint("accession", "name", name=op.f("pk_dose")),
        sqlite_strict=True,
    )
    op.create_table(
        "output",
        sa.Column("reduction", TEXT, nullable=False),
        sa.Column("name", TEXT, nullable=False),
        sa.Column("position", COUNT, nullable=False),
        sa.Column("headline", COUNT, nullable=True),
        sa.Column("step", COUNT, nullable=False),
        sa.Column("quantity", TEXT, nullable=False),
        sa.Column("unit", TEXT, nullable=False),
        sa.Column("ucum", TEXT, nullable=False),
        sa.Column("description", TEXT, nullable=False),
        sa.Column("scale", TEXT, nullable=True),
        sa.Column("rows", COUNT, nullable=True),
        sa.Column("value", REAL, nullable=True),
        sa.Column("uncertainty", REAL, nullable=True),
        sa.Column("value_si", REAL, nullable=True),
        sa.Column("uncertainty_si", REAL, nullable=True),
        sa.Column("verdict", TEXT, nullable=True),
        sa.Column("digest", TEXT, nullable=False),
        sa.ForeignKeyConstraint(["reduction"], ["reduction.address"], name=op.f("fk_output_reduction")),
        sa.PrimaryKeyConstraint("reduction", "name", name=op.f("pk_output")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_output_name_value_si"), "output", ["name", "value_si"], unique=False)
    op.create_table(
        "raw_file",
        sa.Column("accession", TEXT, nullable=False),
        sa.Column("name", TEXT, nullable=False),
        sa.Column("sha256", TEXT, nullable=False),
        sa.Column("size", COUNT, nullable=False),
        sa.Column("role", TEXT, nullable=False),
        sa.ForeignKeyConstraint(["accession"], ["accession.address"], name=op.f("fk_raw_file_accession")),
        sa.PrimaryKeyConstraint("accession", "name", name=op.f("pk_raw_file")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_raw_file_sha256"), "raw_file", ["sha256"], unique=False)
    op.create_table(
        "record",
        sa.Column("accession", TEXT, nullable=False),
        sa.Column("address", TEXT, nullable=False),
        sa.Column("name", TEXT, nullable=False),
        sa.Column("revision", COUNT, nullable=False),
        sa.Column("kind", TEXT, nullable=False),
        sa.Column("digest", TEXT, nullable=False),
        sa.Column("content", TEXT, nullable=False),
        sa.ForeignKeyConstraint(["accession"], ["accession.address"], name=op.f("fk_record_accession")),
        sa.PrimaryKeyConstraint("accession", "address", name=op.f("pk_record")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_record_address"), "record", ["address"], unique=False)
    op.create_index(op.f("ix_record_name_revision"), "record", ["name", "revision"], unique=False)
    op.create_table(
        "reduction_input",
        sa.Column("reduction", TEXT, nullable=False),
        sa.Column("position", COUNT, nullable=False),
        sa.Column("address", TEXT, nullable=False),
        sa.Column("role", TEXT, nullable=False),
        sa.Column("digest", TEXT, nullable=True),
        sa.Column("value", REAL, nullable=True),
        sa.Column("uncertainty", REAL, nullable=True),
        sa.Column("unit", TEXT, nullable=True),
        sa.Column("scale", TEXT, nullable=True),
        sa.ForeignKeyConstraint(
            ["reduction"], ["reduction.address"], name=op.f("fk_reduction_input_reduction")
        ),
        sa.PrimaryKeyConstraint("reduction", "position", name=op.f("pk_reduction_input")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_reduction_input_address"), "reduction_input", ["address"], unique=False)
    op.create_table(
        "step",
        sa.Column("reduction", TEXT, nullable=False),
        sa.Column("number", COUNT, nullable=False),
        sa.Column("name", TEXT, nullable=False),
        sa.Column("version", COUNT, nullable=False),
        sa.Column("sentence", TEXT, nullable=False),
        sa.Column("parameters", TEXT, nullable=False),
        sa.Column("begin", TEXT, nullable=False),
        sa.Column("end", TEXT, nullable=False),
        sa.ForeignKeyConstraint(["reduction"], ["reduction.address"], name=op.f("fk_step_reduction")),
        sa.PrimaryKeyConstraint("reduction", "number", name=op.f("pk_step")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_step_name_version"), "step", ["name", "version"], unique=False)
    op.create_table(
        "sweep",
        sa.Column("accession", TEXT, nullable=False),
        sa.Column("name", TEXT, nullable=False),
        sa.Column("address", TEXT, nullable=False),
        sa.Column("cooldown", TEXT, nullable=False),
        sa.Column("number", COUNT, nullable=False),
        sa.Column("kind", TEXT, nullable=False),
        sa.Column("cell", TEXT, nullable=True),
        sa.Column("substrate", TEXT, nullable=True),
        sa.Column("sample", TEXT, nullable=True),
        sa.Column("empty_cell", FLAG, nullable=False),
        sa.Column("after_dose", TEXT, nullable=True),
        sa.Column("begin", TEXT, nullable=True),
        sa.Column("end", TEXT, nullable=True),
        sa.Column("direction", TEXT, nullable=False),
        sa.Column("rows", COUNT, nullable=False),
        sa.Column("amount_mol", REAL, nullable=True),
        sa.Column("coverage_mol_per_m2", REAL, nullable=True),
        sa.Column("coverage_uncertainty_mol_per_m2", REAL, nullable=True),
        sa.Column("temperature_low_K", REAL, nullable=True),
        sa.Column("temperature_high_K", REAL, nullable=True),
        sa.Column("scale", TEXT, nullable=True),
        sa.Column("text", TEXT, nullable=False),
        sa.ForeignKeyConstraint(["accession"], ["accession.address"], name=op.f("fk_sweep_accession")),
        sa.ForeignKeyConstraint(["cooldown"], ["cooldown.name"], name=op.f("fk_sweep_cooldown")),
        sa.PrimaryKeyConstraint("accession", "name", name=op.f("pk_sweep")),
        sa.UniqueConstraint("address", "number", name=op.f("uq_sweep_address_number")),
        sqlite_strict=True,
    )
    op.create_index(
        op.f("ix_sweep_cell_begin_coverage_mol_per_m2"),
        "sweep",
        ["cell", "begin", "coverage_mol_per_m2"],
        unique=False,
    )
    op.create_index(
        op.f("ix_sweep_cell_coverage_mol_per_m2_begin"),
        "sweep",
        ["cell", "coverage_mol_per_m2", "begin"],
        unique=False,
    )
    op.create_index(op.f("ix_sweep_cooldown_name"), "sweep", ["cooldown", "name"], unique=False)
    op.create_table(
        "channel",
        sa.Column("accession", TEXT, nullable=False),
        sa.Column("sweep", TEXT, nullable=False),
        sa.Column("name", TEXT, nullable=False),
        sa.Column("position", COUNT, nullable=False),
        sa.Column("quantity", TEXT, nullable=False),
        sa.Column("unit", TEXT, nullable=False),
        sa.Column("ucum", TEXT, nullable=False),
        sa.Column("description", TEXT, nullable=False),
        sa.Column("scale", TEXT, nullable=True),
        sa.Column("thermometer", TEXT, nullable=True),
        sa.Column("calibration", TEXT, nullable=True),
        sa.Column("low", REAL, nullable=True),
        sa.Column("high", REAL, nullable=True),
        sa.Column("missing", COUNT, nullable=False),
        sa.Column("use", FLAG, nullable=False),
        sa.Column("digest", TEXT, nullable=False),
        sa.ForeignKeyConstraint(
            ["accession", "sweep"], ["sweep.accession", "sweep.name"], name=op.f("fk_channel_accession_sweep")
        ),
        sa.PrimaryKeyConstraint("accession", "sweep", "name", name=op.f("pk_channel")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_channel_calibration"), "channel", ["calibration"], unique=False)
    op.create_table(
        "sweep_thermometer",
        sa.Column("accession", TEXT, nullable=False),
        sa.Column("sweep", TEXT, nullable=False),
        sa.Column("position", COUNT, nullable=False),
        sa.Column("thermometer", TEXT, nullable=False),
        sa.ForeignKeyConstraint(
            ["accession", "sweep"],
            ["sweep.accession", "sweep.name"],
            name=op.f("fk_sweep_thermometer_accession_sweep"),
        ),
        sa.PrimaryKeyConstraint("accession", "sweep", "position", name=op.f("pk_sweep_thermometer")),
        sqlite_strict=True,
    )
    op.create_index(
        op.f("ix_sweep_thermometer_thermometer"), "sweep_thermometer", ["thermometer"], unique=False
    )


def downgrade() -> None:
    """Take the tables away."""
    for table in reversed(TABLES):
        op.drop_table(table)
