"""What a kept fit holds of each unit stands in a row of its own, so that a question about one probe reads no other's.

Kept fits of the layout before are thrown away: the next question makes them again.

Revision 0003, after 0002; 2026-12-01
"""

import sqlalchemy as sa
from alembic import op

revision = "0003"
down_revision = "0002"
branch_labels = None
depends_on = None

GRANTED = """
SELECT grantee, privilege_type FROM information_schema.role_table_grants
WHERE table_schema = 'public' AND table_name = 'kept_fits' AND grantee <> current_user
"""


def upgrade() -> None:
    op.execute("DELETE FROM kept_fits")
    op.create_table(
        "kept_fit_units",
        sa.Column("analyte_id", sa.Integer(), nullable=False, autoincrement=False),
        sa.Column("unit", sa.Text(), nullable=False),
        sa.Column("fit", sa.Text(), nullable=False),
        sa.PrimaryKeyConstraint("analyte_id", "unit", name="pk_kept_fit_units"),
        sa.ForeignKeyConstraint(["analyte_id"], ["analytes.id"], name=op.f("fk_kept_fit_units_analyte_id")),
        sqlite_strict=True,
    )
    if op.get_bind().dialect.name == "postgresql":
        _admit_whoever_keeps_fits()


def _admit_whoever_keeps_fits() -> None:
    """The roles of a shared record were made before this table was: what they may do with a fit, they may do here."""
    connection = op.get_bind()
    quoted = connection.dialect.identifier_preparer.quote
    for grantee, privilege in connection.execute(sa.text(GRANTED)).all():
        op.execute(f"GRANT {privilege} ON kept_fit_units TO {grantee if grantee == 'PUBLIC' else quoted(grantee)}")


def downgrade() -> None:
    op.execute("DELETE FROM kept_fits")
    op.drop_table("kept_fit_units")
