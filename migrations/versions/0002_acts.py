"""Acts after the fact: revisions of records and plans, amendments of a cooldown, withdrawals.

`sealed_file.document` may name three more kinds. SQLite cannot change a CHECK, and a table that others refer to cannot be
dropped while they do; so every table is copied aside, all are dropped (those that refer to others first), and made again as
they were, but for that CHECK. All of it is one transaction.
"""

from __future__ import annotations

import sqlalchemy as sa
from alembic import op
from sqlalchemy.dialects import postgresql, sqlite

revision = "0002"
down_revision = "0001"
branch_labels = None
depends_on = None

TEXT = sa.Text().with_variant(postgresql.TEXT(collation="C"), "postgresql")
REAL: sa.types.TypeEngine[float] = sa.Double().with_variant(sqlite.REAL(), "sqlite")
COUNT = sa.BigInteger().with_variant(sa.Integer(), "sqlite")
FLAG = sa.Integer()

BEFORE = "document IN ('accession', 'reduction')"
AFTER = "document IN ('accession', 'reduction', 'revision', 'amendment', 'withdrawal')"
CHECK = "ck_sealed_file_document"

FIRST_TABLES = (
    *("cooldown", "plan", "sealed_file", "accession", "finding", "reduction", "dose", "output", "raw_file"),
    *("record", "reduction_input", "step", "sweep", "channel", "sweep_thermometer"),
)
"""Those of revision 0001, in the order in which they are made."""

TABLES = ("replaced_record", "revision", "amendment", "amendment_sweep", "amended_sweep", "withdrawal")
"""Those of this revision, in the same order."""


def upgrade() -> None:
    """Make the tables of acts."""
    _allow(old=BEFORE, new=AFTER)
    op.create_table(
        "replaced_record",
        sa.Column("reduction", TEXT, nullable=False),
        sa.Column("instead_of", TEXT, nullable=False),
        sa.Column("address", TEXT, nullable=False),
        sa.Column("because", TEXT, nullable=False),
        sa.ForeignKeyConstraint(
            ["reduction"], ["reduction.address"], name=op.f("fk_replaced_record_reduction")
        ),
        sa.PrimaryKeyConstraint("reduction", "instead_of", name=op.f("pk_replaced_record")),
        sqlite_strict=True,
    )
    op.create_table(
        "revision",
        sa.Column("address", TEXT, nullable=False),
        sa.Column("key", TEXT, nullable=False),
        sa.Column("kind", TEXT, nullable=False),
        sa.Column("name", TEXT, nullable=False),
        sa.Column("revision", COUNT, nullable=False),
        sa.Column("digest", TEXT, nullable=False),
        sa.Column("content", TEXT, nullable=False),
        sa.Column("supersedes", TEXT, nullable=True),
        sa.Column("because", TEXT, nullable=False),
        sa.Column("by", TEXT, nullable=False),
        sa.Column("made", TEXT, nullable=False),
        sa.Column("stillroom", TEXT, nullable=False),
        sa.ForeignKeyConstraint(["key"], ["sealed_file.key"], name=op.f("fk_revision_key")),
        sa.PrimaryKeyConstraint("address", name=op.f("pk_revision")),
        sa.UniqueConstraint("key", name=op.f("uq_revision_key")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_revision_name_revision"), "revision", ["name", "revision"], unique=False)
    op.create_index(op.f("ix_revision_supersedes"), "revision", ["supersedes"], unique=False)
    op.create_table(
        "amendment",
        sa.Column("address", TEXT, nullable=False),
        sa.Column("key", TEXT, nullable=False),
        sa.Column("cooldown", TEXT, nullable=False),
        sa.Column("number", COUNT, nullable=False),
        sa.Column("because", TEXT, nullable=False),
        sa.Column("by", TEXT, nullable=False),
        sa.Column("made", TEXT, nullable=False),
        sa.Column("differences", TEXT, nullable=False),
        sa.Column("stillroom", TEXT, nullable=False),
        sa.ForeignKeyConstraint(["cooldown"], ["cooldown.name"], name=op.f("fk_amendment_cooldown")),
        sa.ForeignKeyConstraint(["key"], ["sealed_file.key"], name=op.f("fk_amendment_key")),
        sa.PrimaryKeyConstraint("address", name=op.f("pk_amendment")),
        sa.UniqueConstraint("cooldown", "number", name=op.f("uq_amendment_cooldown_number")),
        sa.UniqueConstraint("key", name=op.f("uq_amendment_key")),
        sqlite_strict=True,
    )
    op.create_table(
        "amendment_sweep",
        sa.Column("amendment", TEXT, nullable=False),
        sa.Column("sweep", TEXT, nullable=False),
        sa.ForeignKeyConstraint(
            ["amendment"], ["amendment.address"], name=op.f("fk_amendment_sweep_amendment")
        ),
        sa.PrimaryKeyConstraint("amendment", "sweep", name=op.f("pk_amendment_sweep")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_amendment_sweep_sweep"), "amendment_sweep", ["sweep"], unique=False)
    op.create_table(
        "amended_sweep",
        sa.Column("act", TEXT, nullable=False),
        sa.Column("sweep", TEXT, nullable=False),
        sa.Column("sequence", COUNT, nullable=False),
        sa.Column("number", COUNT, nullable=False),
        sa.Column("coverage_mol_per_m2", REAL, nullable=True),
        sa.Column("coverage_uncertainty_mol_per_m2", REAL, nullable=True),
        sa.Column("temperature_low_K", REAL, nullable=True),
        sa.Column("temperature_high_K", REAL, nullable=True),
        sa.Column("cell", TEXT, nullable=True),
        sa.Column("substrate", TEXT, nullable=True),
        sa.Column("sample", TEXT, nullable=True),
        sa.Column("empty_cell", FLAG, nullable=False),
        sa.Column("after_dose", TEXT, nullable=True),
        sa.Column("direction", TEXT, nullable=False),
        sa.ForeignKeyConstraint(["act"], ["sealed_file.address"], name=op.f("fk_amended_sweep_act")),
        sa.PrimaryKeyConstraint("act", "sweep", name=op.f("pk_amended_sweep")),
        sqlite_strict=True,
    )
    op.create_index(
        op.f("ix_amended_sweep_sweep_sequence"), "amended_sweep", ["sweep", "sequence"], unique=False
    )
    op.create_table(
        "withdrawal",
        sa.Column("address", TEXT, nullable=False),
        sa.Column("key", TEXT, nullable=False),
        sa.Column("target", TEXT, nullable=False),
        sa.Column("cooldown", TEXT, nullable=True),
        sa.Column("number", COUNT, nullable=False),
        sa.Column("why", TEXT, nullable=False),
        sa.Column("by", TEXT, nullable=False),
        sa.Column("made", TEXT, nullable=False),
        sa.Column("stillroom", TEXT, nullable=False),
        sa.ForeignKeyConstraint(["key"], ["sealed_file.key"], name=op.f("fk_withdrawal_key")),
        sa.PrimaryKeyConstraint("address", name=op.f("pk_withdrawal")),
        sa.UniqueConstraint("key", name=op.f("uq_withdrawal_key")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_withdrawal_target"), "withdrawal", ["target"], unique=False)


def downgrade() -> None:
    """Take the tables of acts away; the sealed files stay, and a newer Stillroom can record them again."""
    for table in reversed(TABLES):
        op.drop_table(table)
    op.execute(
        "DELETE FROM finding WHERE key IN (SELECT key FROM sealed_file WHERE document NOT IN ('accession', 'reduction'))"
    )
    op.execute("DELETE FROM sealed_file WHERE document NOT IN ('accession', 'reduction')")
    _allow(old=AFTER, new=BEFORE)


def _allow(*, old: str, new: str) -> None:
    """Change which kinds of document a sealed file can hold."""
    connection = op.get_bind()
    if connection.dialect.name != "sqlite":
        op.drop_constraint(op.f(CHECK), "sealed_file", type_="check")
        op.create_check_constraint(op.f(CHECK), "sealed_file", new)
        return
    tables = sa.text("SELECT name, sql FROM sqlite_master WHERE type = 'table' AND sql IS NOT NULL")
    made: dict[str, str] = {row.name: row.sql for row in connection.execute(tables)}
    indexes = connection.execute(
        sa.text(
            "SELECT sql, tbl_name FROM sqlite_master WHERE type = 'index' AND sql IS NOT NULL ORDER BY name"
        )
    ).all()
    for table in FIRST_TABLES:
        op.execute(f"CREATE TEMPORARY TABLE aside_{table} AS SELECT * FROM {table}")  # noqa: S608 - names of this module
    for table in reversed(FIRST_TABLES):
        op.drop_table(table)
    for table in FIRST_TABLES:
        op.execute(sa.text(made[table].replace(old, new).replace(":", "\\:")))
        op.execute(f"INSERT INTO {table} SELECT * FROM temp.aside_{table}")  # noqa: S608 - as above
        op.execute(f"DROP TABLE temp.aside_{table}")
    for statement, table in indexes:
        if table in FIRST_TABLES:
            op.execute(sa.text(statement.replace(":", "\\:")))
