"""One cohort, one probe and one day are found without reading the others, however many there are.

Calibrations are asked for by cohort: what came since its fit was kept, and what was measured on a day. Labels are
looked up also by what differs in case alone. A kept fit knows the newest calibration that it has seen, so that what
came since is counted and not the whole cohort; of a fit kept before, it is the last of as many as it had seen.

Revision 0002, after 0001; 2026-12-01
"""

import sqlalchemy as sa
from alembic import op

revision = "0002"
down_revision = "0001"
branch_labels = None
depends_on = None

LIVE = sa.text("struck IS NULL")
LABELLED = (("electrodes", "electrode"), ("calibrations", "calibration"))


def upgrade() -> None:
    op.drop_index("ix_calibrations_analyte_id", "calibrations")
    op.drop_index("ix_calibrations_analyte_waveform", "calibrations")
    op.drop_index("ix_calibrations_electrode_id", "calibrations")
    op.create_index("ix_calibrations_probe", "calibrations", ["electrode_id", "analyte_id"])
    _index_live("ix_calibrations_cohort", ["analyte_id", "id"])
    _index_live("ix_calibrations_cohort_at", ["analyte_id", "at"])
    for table, label in LABELLED:
        op.create_index(f"ix_{table}_folded", table, [sa.text(f"lower({label})")])
    op.add_column("kept_fits", sa.Column("seen_newest", sa.Integer()))
    _note_newest()


def _index_live(name: str, columns: list[str]) -> None:
    op.create_index(name, "calibrations", columns, sqlite_where=LIVE, postgresql_where=LIVE)


def _note_newest() -> None:
    connection = op.get_bind()
    last = sa.text(
        "SELECT id FROM calibrations WHERE analyte_id = :analyte AND struck IS NULL ORDER BY id LIMIT 1 OFFSET :before"
    )
    noted = sa.text("UPDATE kept_fits SET seen_newest = :newest WHERE analyte_id = :analyte")
    for analyte, readings in connection.execute(sa.text("SELECT analyte_id, seen_readings FROM kept_fits")).all():
        newest = connection.execute(last, {"analyte": analyte, "before": max(readings - 1, 0)}).scalar()
        connection.execute(noted, {"analyte": analyte, "newest": newest})


def downgrade() -> None:
    op.drop_column("kept_fits", "seen_newest")
    for table, _ in LABELLED:
        op.drop_index(f"ix_{table}_folded", table)
    op.drop_index("ix_calibrations_cohort_at", "calibrations")
    op.drop_index("ix_calibrations_cohort", "calibrations")
    op.drop_index("ix_calibrations_probe", "calibrations")
    op.create_index("ix_calibrations_electrode_id", "calibrations", ["electrode_id"])
    op.create_index("ix_calibrations_analyte_waveform", "calibrations", ["analyte_id", "waveform_id"])
    op.create_index("ix_calibrations_analyte_id", "calibrations", ["analyte_id"])
