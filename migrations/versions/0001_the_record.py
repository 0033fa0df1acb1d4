"""The record: every probe's life, the lab's words, and the journal that guards them.

Written out in full and never edited again: a migration says what the tables were on its day, not what they are now.

Revision 0001, the first; 2026-12-01
"""

import sqlalchemy as sa
from alembic import op

revision = "0001"
down_revision = None
branch_labels = None
depends_on = None

MOMENT = sa.Text().with_variant(sa.TIMESTAMP(timezone=True), "postgresql")
REAL = sa.REAL().with_variant(sa.DOUBLE_PRECISION(), "postgresql")
UTC_SHAPE = "0000-00-00T00:00:00.000000Z".replace("0", "[0-9]")
LIVE = sa.text("struck IS NULL")
CORRECTIONS = sa.text("action <> 'add' AND sheet <> 'limits'")
RECORDED = (
    "terms",
    "analytes",
    "waveforms",
    "batches",
    "electrodes",
    "inspections",
    "coatings",
    "conditionings",
    "cleanings",
    "recuts",
    "standards",
    "calibrations",
    "calibration_points",
    "exposures",
    "retirements",
    "limits",
)
DERIVED = ("calibration_figures", "kept_fits")


def upgrade() -> None:
    _create_journal()
    _create_terms()
    _create_analytes()
    _create_waveforms()
    _create_batches()
    _create_electrodes()
    _create_inspections()
    _create_coatings()
    _create_conditionings()
    _create_cleanings()
    _create_recuts()
    _create_standards()
    _create_calibrations()
    _create_calibration_points()
    _create_exposures()
    _create_retirements()
    _create_limits()
    _create_calibration_figures()
    _create_kept_fits()
    guard = {"sqlite": _guard_sqlite, "postgresql": _guard_postgresql}
    guard[op.get_bind().dialect.name]()


def _create_journal() -> None:
    op.create_table(
        "journal",
        sa.Column("seq", sa.Integer(), nullable=False, autoincrement=False),
        sa.Column("at", MOMENT, nullable=False),
        sa.Column("who", sa.Text(), nullable=False),
        sa.Column("action", sa.Text(), nullable=False),
        sa.Column("sheet", sa.Text(), nullable=False),
        sa.Column("row_id", sa.Integer(), nullable=False),
        sa.Column("reason", sa.Text(), nullable=False),
        sa.Column("change", sa.Text(), nullable=False),
        sa.Column("previous_hash", sa.Text(), nullable=False),
        sa.Column("hash", sa.Text(), nullable=False),
        sa.PrimaryKeyConstraint("seq", name="pk_journal"),
        sa.CheckConstraint("action IN ('add', 'amend', 'strike')", name=op.f("ck_journal_action")),
        sa.CheckConstraint(f"at GLOB '{UTC_SHAPE}'", name=op.f("ck_journal_at_utc")).ddl_if("sqlite"),
        sa.CheckConstraint("length(hash) = 64 AND length(previous_hash) = 64", name=op.f("ck_journal_hash")),
        sa.CheckConstraint("seq > 0", name=op.f("ck_journal_seq")),
        sa.UniqueConstraint("hash", name=op.f("uq_journal_hash")),
        sqlite_strict=True,
    )
    op.create_index(
        "ix_journal_corrections", "journal", ["seq"], sqlite_where=CORRECTIONS, postgresql_where=CORRECTIONS
    )
    op.create_index("ix_journal_sheet_row_id", "journal", ["sheet", "row_id"])


def _create_terms() -> None:
    op.create_table(
        "terms",
        sa.Column("id", sa.Integer(), nullable=False, autoincrement=False),
        sa.Column("kind", sa.Text(), nullable=False),
        sa.Column("term", sa.Text(), nullable=False),
        sa.Column("meaning", sa.Text()),
        sa.Column("struck", sa.Integer()),
        sa.PrimaryKeyConstraint("id", name="pk_terms"),
        sa.CheckConstraint(
            "kind IN ('fibre', 'insulation', 'seal', 'coating material', 'coating method', 'medium', 'setting', 'cleaning method', 'retirement reason')",
            name=op.f("ck_terms_kind"),
        ),
        sa.CheckConstraint("length(meaning) BETWEEN 1 AND 100000", name=op.f("ck_terms_meaning")),
        sa.CheckConstraint("length(term) BETWEEN 1 AND 200", name=op.f("ck_terms_term")),
        sa.ForeignKeyConstraint(["struck"], ["journal.seq"], name=op.f("fk_terms_struck")),
        sqlite_strict=True,
    )
    op.create_index("uq_terms_live", "terms", ["kind", "term"], unique=True, sqlite_where=LIVE, postgresql_where=LIVE)


def _create_analytes() -> None:
    op.create_table(
        "analytes",
        sa.Column("id", sa.Integer(), nullable=False, autoincrement=False),
        sa.Column("analyte", sa.Text(), nullable=False),
        sa.Column("abbreviation", sa.Text()),
        sa.Column("cas", sa.Text()),
        sa.Column("molar_mass_g_mol", REAL),
        sa.Column("note", sa.Text()),
        sa.Column("struck", sa.Integer()),
        sa.PrimaryKeyConstraint("id", name="pk_analytes"),
        sa.CheckConstraint("length(abbreviation) BETWEEN 1 AND 200", name=op.f("ck_analytes_abbreviation")),
        sa.CheckConstraint("length(analyte) BETWEEN 1 AND 200", name=op.f("ck_analytes_analyte")),
        sa.CheckConstraint("length(cas) BETWEEN 1 AND 200", name=op.f("ck_analytes_cas")),
        sa.CheckConstraint(
            "molar_mass_g_mol > 0 AND molar_mass_g_mol <= 1000000", name=op.f("ck_analytes_molar_mass_g_mol")
        ),
        sa.CheckConstraint("length(note) BETWEEN 1 AND 100000", name=op.f("ck_analytes_note")),
        sa.ForeignKeyConstraint(["struck"], ["journal.seq"], name=op.f("fk_analytes_struck")),
        sqlite_strict=True,
    )
    op.create_index("uq_analytes_live", "analytes", ["analyte"], unique=True, sqlite_where=LIVE, postgresql_where=LIVE)


def _create_waveforms() -> None:
    op.create_table(
        "waveforms",
        sa.Column("id", sa.Integer(), nullable=False, autoincrement=False),
        sa.Column("waveform", sa.Text(), nullable=False),
        sa.Column("vertices_v", sa.Text(), nullable=False),
        sa.Column("scan_rate_v_s", REAL, nullable=False),
        sa.Column("frequency_hz", REAL, nullable=False),
        sa.Column("note", sa.Text()),
        sa.Column("struck", sa.Integer()),
        sa.PrimaryKeyConstraint("id", name="pk_waveforms"),
        sa.CheckConstraint("frequency_hz > 0 AND frequency_hz <= 1e+60", name=op.f("ck_waveforms_frequency_hz")),
        sa.CheckConstraint("length(note) BETWEEN 1 AND 100000", name=op.f("ck_waveforms_note")),
        sa.CheckConstraint("scan_rate_v_s > 0 AND scan_rate_v_s <= 1e+60", name=op.f("ck_waveforms_scan_rate_v_s")),
        sa.CheckConstraint("length(vertices_v) BETWEEN 3 AND 100000", name=op.f("ck_waveforms_vertices_v")),
        sa.CheckConstraint("length(waveform) BETWEEN 1 AND 200", name=op.f("ck_waveforms_waveform")),
        sa.ForeignKeyConstraint(["struck"], ["journal.seq"], name=op.f("fk_waveforms_struck")),
        sqlite_strict=True,
    )
    op.create_index(
        "uq_waveforms_live", "waveforms", ["waveform"], unique=True, sqlite_where=LIVE, postgresql_where=LIVE
    )


def _create_batches() -> None:
    op.create_table(
        "batches",
        sa.Column("id", sa.Integer(), nullable=False, autoincrement=False),
        sa.Column("batch", sa.Text(), nullable=False),
        sa.Column("made_on", sa.Text()),
        sa.Column("made_by", sa.Text()),
        sa.Column("fibre", sa.Text()),
        sa.Column("fibre_diameter_um", REAL),
        sa.Column("insulation", sa.Text()),
        sa.Column("seal", sa.Text()),
        sa.Column("backfill", sa.Text()),
        sa.Column("note", sa.Text()),
        sa.Column("struck", sa.Integer()),
        sa.PrimaryKeyConstraint("id", name="pk_batches"),
        sa.CheckConstraint("length(backfill) BETWEEN 1 AND 100000", name=op.f("ck_batches_backfill")),
        sa.CheckConstraint("length(batch) BETWEEN 1 AND 200", name=op.f("ck_batches_batch")),
        sa.CheckConstraint("length(fibre) BETWEEN 1 AND 200", name=op.f("ck_batches_fibre")),
        sa.CheckConstraint(
            "fibre_diameter_um > 0 AND fibre_diameter_um <= 1000", name=op.f("ck_batches_fibre_diameter_um")
        ),
        sa.CheckConstraint("length(insulation) BETWEEN 1 AND 200", name=op.f("ck_batches_insulation")),
        sa.CheckConstraint("length(made_by) BETWEEN 1 AND 100000", name=op.f("ck_batches_made_by")),
        sa.CheckConstraint("made_on LIKE '____-__-__'", name=op.f("ck_batches_made_on")),
        sa.CheckConstraint("length(note) BETWEEN 1 AND 100000", name=op.f("ck_batches_note")),
        sa.CheckConstraint("length(seal) BETWEEN 1 AND 200", name=op.f("ck_batches_seal")),
        sa.ForeignKeyConstraint(["struck"], ["journal.seq"], name=op.f("fk_batches_struck")),
        sqlite_strict=True,
    )
    op.create_index("uq_batches_live", "batches", ["batch"], unique=True, sqlite_where=LIVE, postgresql_where=LIVE)


def _create_electrodes() -> None:
    op.create_table(
        "electrodes",
        sa.Column("id", sa.Integer(), nullable=False, autoincrement=False),
        sa.Column("electrode", sa.Text(), nullable=False),
        sa.Column("batch_id", sa.Integer()),
        sa.Column("geometry", sa.Text()),
        sa.Column("exposed_length_um", REAL),
        sa.Column("diameter_um", REAL),
        sa.Column("note", sa.Text()),
        sa.Column("struck", sa.Integer()),
        sa.PrimaryKeyConstraint("id", name="pk_electrodes"),
        sa.CheckConstraint("diameter_um > 0 AND diameter_um <= 1000", name=op.f("ck_electrodes_diameter_um")),
        sa.CheckConstraint("length(electrode) BETWEEN 1 AND 200", name=op.f("ck_electrodes_electrode")),
        sa.CheckConstraint(
            "exposed_length_um > 0 AND exposed_length_um <= 100000", name=op.f("ck_electrodes_exposed_length_um")
        ),
        sa.CheckConstraint("geometry IN ('cylinder', 'disk', 'other')", name=op.f("ck_electrodes_geometry")),
        sa.CheckConstraint("length(note) BETWEEN 1 AND 100000", name=op.f("ck_electrodes_note")),
        sa.ForeignKeyConstraint(["batch_id"], ["batches.id"], name=op.f("fk_electrodes_batch_id")),
        sa.ForeignKeyConstraint(["struck"], ["journal.seq"], name=op.f("fk_electrodes_struck")),
        sqlite_strict=True,
    )
    op.create_index("ix_electrodes_batch_id", "electrodes", ["batch_id"])
    op.create_index(
        "uq_electrodes_live", "electrodes", ["electrode"], unique=True, sqlite_where=LIVE, postgresql_where=LIVE
    )


def _create_inspections() -> None:
    op.create_table(
        "inspections",
        sa.Column("id", sa.Integer(), nullable=False, autoincrement=False),
        sa.Column("electrode_id", sa.Integer(), nullable=False),
        sa.Column("at", MOMENT, nullable=False),
        sa.Column("exposed_length_um", REAL),
        sa.Column("seal_ok", sa.Text()),
        sa.Column("background_na", REAL),
        sa.Column("noise_na", REAL),
        sa.Column("note", sa.Text()),
        sa.Column("struck", sa.Integer()),
        sa.PrimaryKeyConstraint("id", name="pk_inspections"),
        sa.CheckConstraint(f"at GLOB '{UTC_SHAPE}'", name=op.f("ck_inspections_at_utc")).ddl_if("sqlite"),
        sa.CheckConstraint("background_na >= 0 AND background_na <= 1e+60", name=op.f("ck_inspections_background_na")),
        sa.CheckConstraint(
            "exposed_length_um > 0 AND exposed_length_um <= 100000", name=op.f("ck_inspections_exposed_length_um")
        ),
        sa.CheckConstraint("noise_na >= 0 AND noise_na <= 1e+60", name=op.f("ck_inspections_noise_na")),
        sa.CheckConstraint("length(note) BETWEEN 1 AND 100000", name=op.f("ck_inspections_note")),
        sa.CheckConstraint("seal_ok IN ('yes', 'no')", name=op.f("ck_inspections_seal_ok")),
        sa.ForeignKeyConstraint(["electrode_id"], ["electrodes.id"], name=op.f("fk_inspections_electrode_id")),
        sa.ForeignKeyConstraint(["struck"], ["journal.seq"], name=op.f("fk_inspections_struck")),
        sqlite_strict=True,
    )
    op.create_index(
        "uq_inspections_live",
        "inspections",
        ["electrode_id", "at"],
        unique=True,
        sqlite_where=LIVE,
        postgresql_where=LIVE,
    )


def _create_coatings() -> None:
    op.create_table(
        "coatings",
        sa.Column("id", sa.Integer(), nullable=False, autoincrement=False),
        sa.Column("electrode_id", sa.Integer(), nullable=False),
        sa.Column("at", MOMENT, nullable=False),
        sa.Column("material", sa.Text(), nullable=False),
        sa.Column("method", sa.Text()),
        sa.Column("potential_v", REAL),
        sa.Column("duration_s", REAL),
        sa.Column("concentration_wt_pct", REAL),
        sa.Column("layers", REAL),
        sa.Column("cure_temperature_c", REAL),
        sa.Column("cure_min", REAL),
        sa.Column("note", sa.Text()),
        sa.Column("struck", sa.Integer()),
        sa.PrimaryKeyConstraint("id", name="pk_coatings"),
        sa.CheckConstraint(f"at GLOB '{UTC_SHAPE}'", name=op.f("ck_coatings_at_utc")).ddl_if("sqlite"),
        sa.CheckConstraint(
            "concentration_wt_pct >= 0 AND concentration_wt_pct <= 100", name=op.f("ck_coatings_concentration_wt_pct")
        ),
        sa.CheckConstraint("cure_min >= 0 AND cure_min <= 1e+60", name=op.f("ck_coatings_cure_min")),
        sa.CheckConstraint(
            "cure_temperature_c >= -273.15 AND cure_temperature_c <= 1000", name=op.f("ck_coatings_cure_temperature_c")
        ),
        sa.CheckConstraint("duration_s > 0 AND duration_s <= 1e+60", name=op.f("ck_coatings_duration_s")),
        sa.CheckConstraint(
            "layers >= 1 AND layers <= 1000 AND layers = round(layers)", name=op.f("ck_coatings_layers")
        ),
        sa.CheckConstraint("length(material) BETWEEN 1 AND 200", name=op.f("ck_coatings_material")),
        sa.CheckConstraint("length(method) BETWEEN 1 AND 200", name=op.f("ck_coatings_method")),
        sa.CheckConstraint("length(note) BETWEEN 1 AND 100000", name=op.f("ck_coatings_note")),
        sa.CheckConstraint("potential_v >= -10 AND potential_v <= 10", name=op.f("ck_coatings_potential_v")),
        sa.ForeignKeyConstraint(["electrode_id"], ["electrodes.id"], name=op.f("fk_coatings_electrode_id")),
        sa.ForeignKeyConstraint(["struck"], ["journal.seq"], name=op.f("fk_coatings_struck")),
        sqlite_strict=True,
    )
    op.create_index(
        "uq_coatings_live",
        "coatings",
        ["electrode_id", "at", "material"],
        unique=True,
        sqlite_where=LIVE,
        postgresql_where=LIVE,
    )


def _create_conditionings() -> None:
    op.create_table(
        "conditionings",
        sa.Column("id", sa.Integer(), nullable=False, autoincrement=False),
        sa.Column("electrode_id", sa.Integer(), nullable=False),
        sa.Column("at", MOMENT, nullable=False),
        sa.Column("waveform_id", sa.Integer()),
        sa.Column("duration_min", REAL),
        sa.Column("medium", sa.Text()),
        sa.Column("note", sa.Text()),
        sa.Column("struck", sa.Integer()),
        sa.PrimaryKeyConstraint("id", name="pk_conditionings"),
        sa.CheckConstraint(f"at GLOB '{UTC_SHAPE}'", name=op.f("ck_conditionings_at_utc")).ddl_if("sqlite"),
        sa.CheckConstraint("duration_min > 0 AND duration_min <= 5000000", name=op.f("ck_conditionings_duration_min")),
        sa.CheckConstraint("length(medium) BETWEEN 1 AND 200", name=op.f("ck_conditionings_medium")),
        sa.CheckConstraint("length(note) BETWEEN 1 AND 100000", name=op.f("ck_conditionings_note")),
        sa.ForeignKeyConstraint(["electrode_id"], ["electrodes.id"], name=op.f("fk_conditionings_electrode_id")),
        sa.ForeignKeyConstraint(["struck"], ["journal.seq"], name=op.f("fk_conditionings_struck")),
        sa.ForeignKeyConstraint(["waveform_id"], ["waveforms.id"], name=op.f("fk_conditionings_waveform_id")),
        sqlite_strict=True,
    )
    op.create_index("ix_conditionings_waveform_id", "conditionings", ["waveform_id"])
    op.create_index(
        "uq_conditionings_live",
        "conditionings",
        ["electrode_id", "at"],
        unique=True,
        sqlite_where=LIVE,
        postgresql_where=LIVE,
    )


def _create_cleanings() -> None:
    op.create_table(
        "cleanings",
        sa.Column("id", sa.Integer(), nullable=False, autoincrement=False),
        sa.Column("electrode_id", sa.Integer(), nullable=False),
        sa.Column("at", MOMENT, nullable=False),
        sa.Column("method", sa.Text(), nullable=False),
        sa.Column("duration_min", REAL),
        sa.Column("note", sa.Text()),
        sa.Column("struck", sa.Integer()),
        sa.PrimaryKeyConstraint("id", name="pk_cleanings"),
        sa.CheckConstraint(f"at GLOB '{UTC_SHAPE}'", name=op.f("ck_cleanings_at_utc")).ddl_if("sqlite"),
        sa.CheckConstraint("duration_min > 0 AND duration_min <= 5000000", name=op.f("ck_cleanings_duration_min")),
        sa.CheckConstraint("length(method) BETWEEN 1 AND 200", name=op.f("ck_cleanings_method")),
        sa.CheckConstraint("length(note) BETWEEN 1 AND 100000", name=op.f("ck_cleanings_note")),
        sa.ForeignKeyConstraint(["electrode_id"], ["electrodes.id"], name=op.f("fk_cleanings_electrode_id")),
        sa.ForeignKeyConstraint(["struck"], ["journal.seq"], name=op.f("fk_cleanings_struck")),
        sqlite_strict=True,
    )
    op.create_index(
        "uq_cleanings_live",
        "cleanings",
        ["electrode_id", "at", "method"],
        unique=True,
        sqlite_where=LIVE,
        postgresql_where=LIVE,
    )


def _create_recuts() -> None:
    op.create_table(
        "recuts",
        sa.Column("id", sa.Integer(), nullable=False, autoincrement=False),
        sa.Column("electrode_id", sa.Integer(), nullable=False),
        sa.Column("at", MOMENT, nullable=False),
        sa.Column("exposed_length_um", REAL),
        sa.Column("note", sa.Text()),
        sa.Column("struck", sa.Integer()),
        sa.PrimaryKeyConstraint("id", name="pk_recuts"),
        sa.CheckConstraint(f"at GLOB '{UTC_SHAPE}'", name=op.f("ck_recuts_at_utc")).ddl_if("sqlite"),
        sa.CheckConstraint(
            "exposed_length_um > 0 AND exposed_length_um <= 100000", name=op.f("ck_recuts_exposed_length_um")
        ),
        sa.CheckConstraint("length(note) BETWEEN 1 AND 100000", name=op.f("ck_recuts_note")),
        sa.ForeignKeyConstraint(["electrode_id"], ["electrodes.id"], name=op.f("fk_recuts_electrode_id")),
        sa.ForeignKeyConstraint(["struck"], ["journal.seq"], name=op.f("fk_recuts_struck")),
        sqlite_strict=True,
    )
    op.create_index(
        "uq_recuts_live", "recuts", ["electrode_id", "at"], unique=True, sqlite_where=LIVE, postgresql_where=LIVE
    )


def _create_standards() -> None:
    op.create_table(
        "standards",
        sa.Column("id", sa.Integer(), nullable=False, autoincrement=False),
        sa.Column("standard", sa.Text(), nullable=False),
        sa.Column("analyte_id", sa.Integer(), nullable=False),
        sa.Column("prepared_at", MOMENT, nullable=False),
        sa.Column("concentration_um", REAL, nullable=False),
        sa.Column("relative_uncertainty", REAL),
        sa.Column("diluent", sa.Text()),
        sa.Column("expires_at", MOMENT),
        sa.Column("note", sa.Text()),
        sa.Column("struck", sa.Integer()),
        sa.PrimaryKeyConstraint("id", name="pk_standards"),
        sa.CheckConstraint(
            "concentration_um > 0 AND concentration_um <= 1e+60", name=op.f("ck_standards_concentration_um")
        ),
        sa.CheckConstraint("length(diluent) BETWEEN 1 AND 100000", name=op.f("ck_standards_diluent")),
        sa.CheckConstraint(f"expires_at GLOB '{UTC_SHAPE}'", name=op.f("ck_standards_expires_at_utc")).ddl_if("sqlite"),
        sa.CheckConstraint("length(note) BETWEEN 1 AND 100000", name=op.f("ck_standards_note")),
        sa.CheckConstraint(f"prepared_at GLOB '{UTC_SHAPE}'", name=op.f("ck_standards_prepared_at_utc")).ddl_if(
            "sqlite"
        ),
        sa.CheckConstraint(
            "relative_uncertainty >= 0 AND relative_uncertainty <= 1", name=op.f("ck_standards_relative_uncertainty")
        ),
        sa.CheckConstraint("length(standard) BETWEEN 1 AND 200", name=op.f("ck_standards_standard")),
        sa.ForeignKeyConstraint(["analyte_id"], ["analytes.id"], name=op.f("fk_standards_analyte_id")),
        sa.ForeignKeyConstraint(["struck"], ["journal.seq"], name=op.f("fk_standards_struck")),
        sqlite_strict=True,
    )
    op.create_index("ix_standards_analyte_id", "standards", ["analyte_id"])
    op.create_index(
        "uq_standards_live", "standards", ["standard"], unique=True, sqlite_where=LIVE, postgresql_where=LIVE
    )


def _create_calibrations() -> None:
    op.create_table(
        "calibrations",
        sa.Column("id", sa.Integer(), nullable=False, autoincrement=False),
        sa.Column("calibration", sa.Text(), nullable=False),
        sa.Column("electrode_id", sa.Integer(), nullable=False),
        sa.Column("at", MOMENT, nullable=False),
        sa.Column("stage", sa.Text(), nullable=False),
        sa.Column("analyte_id", sa.Integer(), nullable=False),
        sa.Column("waveform_id", sa.Integer(), nullable=False),
        sa.Column("medium", sa.Text()),
        sa.Column("temperature_c", REAL),
        sa.Column("standard_id", sa.Integer()),
        sa.Column("rig", sa.Text()),
        sa.Column("by", sa.Text()),
        sa.Column("noise_na", REAL),
        sa.Column("background_na", REAL),
        sa.Column("oxidation_peak_v", REAL),
        sa.Column("reduction_peak_v", REAL),
        sa.Column("sensitivity_na_um", REAL),
        sa.Column("sensitivity_se_na_um", REAL),
        sa.Column("note", sa.Text()),
        sa.Column("struck", sa.Integer()),
        sa.PrimaryKeyConstraint("id", name="pk_calibrations"),
        sa.CheckConstraint(f"at GLOB '{UTC_SHAPE}'", name=op.f("ck_calibrations_at_utc")).ddl_if("sqlite"),
        sa.CheckConstraint(
            "background_na >= -1e+60 AND background_na <= 1e+60", name=op.f("ck_calibrations_background_na")
        ),
        sa.CheckConstraint("length(by) BETWEEN 1 AND 100000", name=op.f("ck_calibrations_by")),
        sa.CheckConstraint("length(calibration) BETWEEN 1 AND 200", name=op.f("ck_calibrations_calibration")),
        sa.CheckConstraint("length(medium) BETWEEN 1 AND 200", name=op.f("ck_calibrations_medium")),
        sa.CheckConstraint("noise_na >= 0 AND noise_na <= 1e+60", name=op.f("ck_calibrations_noise_na")),
        sa.CheckConstraint("length(note) BETWEEN 1 AND 100000", name=op.f("ck_calibrations_note")),
        sa.CheckConstraint(
            "oxidation_peak_v >= -10 AND oxidation_peak_v <= 10", name=op.f("ck_calibrations_oxidation_peak_v")
        ),
        sa.CheckConstraint(
            "reduction_peak_v >= -10 AND reduction_peak_v <= 10", name=op.f("ck_calibrations_reduction_peak_v")
        ),
        sa.CheckConstraint("length(rig) BETWEEN 1 AND 200", name=op.f("ck_calibrations_rig")),
        sa.CheckConstraint(
            "sensitivity_na_um >= -1e+60 AND sensitivity_na_um <= 1e+60",
            name=op.f("ck_calibrations_sensitivity_na_um"),
        ),
        sa.CheckConstraint(
            "sensitivity_se_na_um >= 0 AND sensitivity_se_na_um <= 1e+60",
            name=op.f("ck_calibrations_sensitivity_se_na_um"),
        ),
        sa.CheckConstraint("stage IN ('pre', 'interim', 'post')", name=op.f("ck_calibrations_stage")),
        sa.CheckConstraint("temperature_c >= -20 AND temperature_c <= 110", name=op.f("ck_calibrations_temperature_c")),
        sa.ForeignKeyConstraint(["analyte_id"], ["analytes.id"], name=op.f("fk_calibrations_analyte_id")),
        sa.ForeignKeyConstraint(["electrode_id"], ["electrodes.id"], name=op.f("fk_calibrations_electrode_id")),
        sa.ForeignKeyConstraint(["standard_id"], ["standards.id"], name=op.f("fk_calibrations_standard_id")),
        sa.ForeignKeyConstraint(["struck"], ["journal.seq"], name=op.f("fk_calibrations_struck")),
        sa.ForeignKeyConstraint(["waveform_id"], ["waveforms.id"], name=op.f("fk_calibrations_waveform_id")),
        sqlite_strict=True,
    )
    op.create_index("ix_calibrations_analyte_id", "calibrations", ["analyte_id"])
    op.create_index("ix_calibrations_analyte_waveform", "calibrations", ["analyte_id", "waveform_id"])
    op.create_index("ix_calibrations_electrode_id", "calibrations", ["electrode_id"])
    op.create_index("ix_calibrations_standard_id", "calibrations", ["standard_id"])
    op.create_index("ix_calibrations_waveform_id", "calibrations", ["waveform_id"])
    op.create_index(
        "uq_calibrations_live", "calibrations", ["calibration"], unique=True, sqlite_where=LIVE, postgresql_where=LIVE
    )


def _create_calibration_points() -> None:
    op.create_table(
        "calibration_points",
        sa.Column("calibration_id", sa.Integer(), nullable=False),
        sa.Column("concentration_um", REAL, nullable=False),
        sa.Column("current_na", REAL, nullable=False),
        sa.Column("ordinal", sa.Integer(), nullable=False),
        sa.Column("struck", sa.Integer()),
        sa.PrimaryKeyConstraint("calibration_id", "ordinal", name="pk_calibration_points"),
        sa.CheckConstraint(
            "concentration_um >= 0 AND concentration_um <= 1e+60", name=op.f("ck_calibration_points_concentration_um")
        ),
        sa.CheckConstraint(
            "current_na >= -1e+60 AND current_na <= 1e+60", name=op.f("ck_calibration_points_current_na")
        ),
        sa.ForeignKeyConstraint(
            ["calibration_id"], ["calibrations.id"], name=op.f("fk_calibration_points_calibration_id")
        ),
        sa.ForeignKeyConstraint(["struck"], ["journal.seq"], name=op.f("fk_calibration_points_struck")),
        sqlite_strict=True,
    )


def _create_exposures() -> None:
    op.create_table(
        "exposures",
        sa.Column("id", sa.Integer(), nullable=False, autoincrement=False),
        sa.Column("electrode_id", sa.Integer(), nullable=False),
        sa.Column("start", MOMENT, nullable=False),
        sa.Column("duration_min", REAL, nullable=False),
        sa.Column("setting", sa.Text(), nullable=False),
        sa.Column("waveform_id", sa.Integer()),
        sa.Column("medium", sa.Text()),
        sa.Column("subject", sa.Text()),
        sa.Column("recording", sa.Text()),
        sa.Column("by", sa.Text()),
        sa.Column("note", sa.Text()),
        sa.Column("struck", sa.Integer()),
        sa.PrimaryKeyConstraint("id", name="pk_exposures"),
        sa.CheckConstraint("length(by) BETWEEN 1 AND 100000", name=op.f("ck_exposures_by")),
        sa.CheckConstraint("duration_min > 0 AND duration_min <= 5000000", name=op.f("ck_exposures_duration_min")),
        sa.CheckConstraint("length(medium) BETWEEN 1 AND 200", name=op.f("ck_exposures_medium")),
        sa.CheckConstraint("length(note) BETWEEN 1 AND 100000", name=op.f("ck_exposures_note")),
        sa.CheckConstraint("length(recording) BETWEEN 1 AND 100000", name=op.f("ck_exposures_recording")),
        sa.CheckConstraint("length(setting) BETWEEN 1 AND 200", name=op.f("ck_exposures_setting")),
        sa.CheckConstraint(f"start GLOB '{UTC_SHAPE}'", name=op.f("ck_exposures_start_utc")).ddl_if("sqlite"),
        sa.CheckConstraint("length(subject) BETWEEN 1 AND 100000", name=op.f("ck_exposures_subject")),
        sa.ForeignKeyConstraint(["electrode_id"], ["electrodes.id"], name=op.f("fk_exposures_electrode_id")),
        sa.ForeignKeyConstraint(["struck"], ["journal.seq"], name=op.f("fk_exposures_struck")),
        sa.ForeignKeyConstraint(["waveform_id"], ["waveforms.id"], name=op.f("fk_exposures_waveform_id")),
        sqlite_strict=True,
    )
    op.create_index("ix_exposures_waveform_id", "exposures", ["waveform_id"])
    op.create_index(
        "uq_exposures_live",
        "exposures",
        ["electrode_id", "start"],
        unique=True,
        sqlite_where=LIVE,
        postgresql_where=LIVE,
    )


def _create_retirements() -> None:
    op.create_table(
        "retirements",
        sa.Column("id", sa.Integer(), nullable=False, autoincrement=False),
        sa.Column("electrode_id", sa.Integer(), nullable=False),
        sa.Column("at", MOMENT, nullable=False),
        sa.Column("reason", sa.Text(), nullable=False),
        sa.Column("note", sa.Text()),
        sa.Column("struck", sa.Integer()),
        sa.PrimaryKeyConstraint("id", name="pk_retirements"),
        sa.CheckConstraint(f"at GLOB '{UTC_SHAPE}'", name=op.f("ck_retirements_at_utc")).ddl_if("sqlite"),
        sa.CheckConstraint("length(note) BETWEEN 1 AND 100000", name=op.f("ck_retirements_note")),
        sa.CheckConstraint("length(reason) BETWEEN 1 AND 200", name=op.f("ck_retirements_reason")),
        sa.ForeignKeyConstraint(["electrode_id"], ["electrodes.id"], name=op.f("fk_retirements_electrode_id")),
        sa.ForeignKeyConstraint(["struck"], ["journal.seq"], name=op.f("fk_retirements_struck")),
        sqlite_strict=True,
    )
    op.create_index(
        "uq_retirements_live", "retirements", ["electrode_id"], unique=True, sqlite_where=LIVE, postgresql_where=LIVE
    )


def _create_limits() -> None:
    op.create_table(
        "limits",
        sa.Column("id", sa.Integer(), nullable=False, autoincrement=False),
        sa.Column("rule", sa.Text(), nullable=False),
        sa.Column("analyte_id", sa.Integer()),
        sa.Column("project", sa.Text()),
        sa.Column("value", REAL, nullable=False),
        sa.Column("origin", sa.Text(), nullable=False),
        sa.Column("note", sa.Text()),
        sa.Column("struck", sa.Integer()),
        sa.PrimaryKeyConstraint("id", name="pk_limits"),
        sa.CheckConstraint("length(note) BETWEEN 1 AND 100000", name=op.f("ck_limits_note")),
        sa.CheckConstraint("origin IN ('lab decision', 'common practice')", name=op.f("ck_limits_origin")),
        sa.CheckConstraint("length(project) BETWEEN 1 AND 200", name=op.f("ck_limits_project")),
        sa.CheckConstraint("length(rule) BETWEEN 1 AND 200", name=op.f("ck_limits_rule")),
        sa.CheckConstraint("value >= -1e+60 AND value <= 1e+60", name=op.f("ck_limits_value")),
        sa.ForeignKeyConstraint(["analyte_id"], ["analytes.id"], name=op.f("fk_limits_analyte_id")),
        sa.ForeignKeyConstraint(["struck"], ["journal.seq"], name=op.f("fk_limits_struck")),
        sqlite_strict=True,
    )
    op.create_index("ix_limits_analyte_id", "limits", ["analyte_id"])
    op.create_index(
        "uq_limits_live",
        "limits",
        ["rule", sa.text("coalesce(analyte_id, 0)"), sa.text("coalesce(project, '')")],
        unique=True,
        sqlite_where=LIVE,
        postgresql_where=LIVE,
    )


def _create_calibration_figures() -> None:
    op.create_table(
        "calibration_figures",
        sa.Column("calibration_id", sa.Integer(), nullable=False, autoincrement=False),
        sa.Column("method", sa.Text(), nullable=False),
        sa.Column("figures", sa.Text(), nullable=False),
        sa.PrimaryKeyConstraint("calibration_id", name="pk_calibration_figures"),
        sa.ForeignKeyConstraint(
            ["calibration_id"], ["calibrations.id"], name=op.f("fk_calibration_figures_calibration_id")
        ),
        sqlite_strict=True,
    )


def _create_kept_fits() -> None:
    op.create_table(
        "kept_fits",
        sa.Column("analyte_id", sa.Integer(), nullable=False, autoincrement=False),
        sa.Column("method", sa.Text(), nullable=False),
        sa.Column("fingerprint", sa.Text(), nullable=False),
        sa.Column("seen_readings", sa.Integer(), nullable=False),
        sa.Column("seen_correction", sa.Integer(), nullable=False),
        sa.Column("made_at", MOMENT, nullable=False),
        sa.Column("fit", sa.Text(), nullable=False),
        sa.PrimaryKeyConstraint("analyte_id", name="pk_kept_fits"),
        sa.ForeignKeyConstraint(["analyte_id"], ["analytes.id"], name=op.f("fk_kept_fits_analyte_id")),
        sqlite_strict=True,
    )


def _guard_sqlite() -> None:
    """No row is ever deleted, and the journal is only ever added to: whoever opens the file is held to it."""
    for table in RECORDED:
        _refuse_sqlite(table, "DELETE", "the record keeps every row: strike it instead")
    _refuse_sqlite("journal", "UPDATE", "the journal is append-only")
    _refuse_sqlite("journal", "DELETE", "the journal is append-only")


def _refuse_sqlite(table: str, action: str, why: str) -> None:
    op.execute(
        f"CREATE TRIGGER guard_{table}_{action.lower()} BEFORE {action} ON {table}"
        f" BEGIN SELECT RAISE(ABORT, '{why}'); END"
    )


def _guard_postgresql() -> None:
    op.execute(
        "CREATE FUNCTION refuse_change() RETURNS trigger LANGUAGE plpgsql AS"
        " $$ BEGIN RAISE EXCEPTION '% on % is refused: the record keeps every row', TG_OP, TG_TABLE_NAME; END $$"
    )
    for table in RECORDED:
        op.execute(
            f"CREATE TRIGGER guard_{table} BEFORE DELETE OR TRUNCATE ON {table}"
            " FOR EACH STATEMENT EXECUTE FUNCTION refuse_change()"
        )
    op.execute(
        "CREATE TRIGGER guard_journal BEFORE UPDATE OR DELETE OR TRUNCATE ON journal"
        " FOR EACH STATEMENT EXECUTE FUNCTION refuse_change()"
    )


def downgrade() -> None:
    """Back to an empty database; there is nothing before the first revision to keep rows in."""
    for table in reversed(("journal", *RECORDED, *DERIVED)):
        op.drop_table(table)
    if op.get_bind().dialect.name == "postgresql":
        op.execute("DROP FUNCTION refuse_change()")
