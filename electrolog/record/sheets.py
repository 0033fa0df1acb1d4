"""Every kind of row in the record, declared once: the exchange files, the tables, entry, amendment and the data
dictionary are all made from here. The names are a contract with other programs; see README, "The exchange folder".
"""

from __future__ import annotations

from electrolog import units
from electrolog.record.columns import (
    Choice,
    Day,
    Label,
    Link,
    Moment,
    Number,
    Text,
    Vertices,
    Word,
)
from electrolog.record.sheet import AT, BY, NOTE, PROBE, Sheet, current, length, minutes, potential
from electrolog.record.word_kinds import WORD_KINDS

__all__ = ["BY_NAME", "EVENTS", "SHEETS", "WORD_KINDS", "Sheet"]

TERMS = Sheet(
    "terms",
    "word",
    "the lab's own additions to a word list",
    (
        Choice("kind", "which word list", required=True, choices=WORD_KINDS),
        Label("term", "the word", required=True),
        Text("meaning", "what the lab means by it"),
    ),
    key=("kind", "term"),
)
ANALYTES = Sheet(
    "analytes",
    "analyte",
    "what is detected",
    (
        Label("analyte", "name", required=True),
        Label("abbreviation", "short form, accepted wherever the name is"),
        Label("cas", "CAS registry number"),
        Number("molar_mass_g_mol", "molar mass", unit=units.MOLAR_MASS_G_MOL, above=0, most=1e6),
        NOTE,
    ),
    key=("analyte",),
)
WAVEFORMS = Sheet(
    "waveforms",
    "waveform",
    "potential sweeps by their shape",
    (
        Label("waveform", "name", required=True),
        Vertices(
            "vertices_v",
            "potentials in V: first the holding potential, last where the scan ends",
            required=True,
        ),
        Number("scan_rate_v_s", "scan rate", required=True, unit=units.SCAN_RATE_V_S, above=0),
        Number("frequency_hz", "scans per second", required=True, unit=units.FREQUENCY_HZ, above=0),
        NOTE,
    ),
    key=("waveform",),
)
BATCHES = Sheet(
    "batches",
    "batch",
    "probes made together",
    (
        Label("batch", "label", required=True),
        Day("made_on", "date of making"),
        Text("made_by", "maker"),
        Word("fibre", "carbon fibre", kind="fibre"),
        Number("fibre_diameter_um", "fibre diameter", unit=units.LENGTH_UM, above=0, most=1000),
        Word("insulation", "insulation", kind="insulation"),
        Word("seal", "seal between carbon and insulation", kind="seal"),
        Text("backfill", "electrical contact inside"),
        NOTE,
    ),
    key=("batch",),
)
ELECTRODES = Sheet(
    "electrodes",
    "probe",
    "one row per microelectrode",
    (
        Label("electrode", "label", required=True),
        Link("batch", "label of its batch", to="batches"),
        Choice("geometry", "shape of the exposed carbon", choices=("cylinder", "disk", "other")),
        length(),
        Number("diameter_um", "diameter of the exposed carbon", unit=units.LENGTH_UM, above=0, most=1000),
        NOTE,
    ),
    key=("electrode",),
)
INSPECTIONS = Sheet(
    "inspections",
    "inspection",
    "what a look or a test showed, or a remark",
    (
        PROBE,
        AT,
        length(),
        Choice("seal_ok", "whether the seal holds", choices=("yes", "no")),
        current("background_na", "background charging current", least=0),
        current("noise_na", "standard deviation of the signal at rest", least=0),
        NOTE,
    ),
    key=("electrode", "at"),
)
COATINGS = Sheet(
    "coatings",
    "coating",
    "films put on the carbon",
    (
        PROBE,
        AT,
        Word("material", "film", required=True, kind="coating material"),
        Word("method", "how it was put on", kind="coating method"),
        potential("potential_v", "potential held while coating"),
        Number("duration_s", "how long", unit=units.SECONDS, above=0),
        Number(
            "concentration_wt_pct",
            "share by weight in the bath",
            unit=units.WEIGHT_PERCENT,
            least=0,
            most=100,
        ),
        Number("layers", "number of layers", unit=units.COUNT, least=1, most=1000, whole=True),
        Number("cure_temperature_c", "curing temperature", unit=units.TEMPERATURE_C, least=-273.15, most=1000),
        Number("cure_min", "curing time", unit=units.MINUTES, least=0),
        NOTE,
    ),
    key=("electrode", "at", "material"),
)
CONDITIONINGS = Sheet(
    "conditionings",
    "conditioning",
    "cycling before use",
    (
        PROBE,
        AT,
        Link("waveform", "waveform applied", to="waveforms"),
        minutes(),
        Word("medium", "what it was in", kind="medium"),
        NOTE,
    ),
    key=("electrode", "at"),
)
CLEANINGS = Sheet(
    "cleanings",
    "cleaning",
    "what was done to undo fouling",
    (PROBE, AT, Word("method", "cleaning method", required=True, kind="cleaning method"), minutes(), NOTE),
    key=("electrode", "at", "method"),
)
RECUTS = Sheet("recuts", "re-cut", "the carbon trimmed anew", (PROBE, AT, length(), NOTE), key=("electrode", "at"))
STANDARDS = Sheet(
    "standards",
    "standard",
    "solutions that probes are calibrated with",
    (
        Label("standard", "label", required=True),
        Link("analyte", "what is in it", required=True, to="analytes"),
        Moment("prepared_at", "when it was made", required=True),
        Number("concentration_um", "concentration", required=True, unit=units.CONCENTRATION_UM, above=0),
        Number("relative_uncertainty", "standard uncertainty over value", unit=units.FRACTION, least=0, most=1),
        Text("diluent", "what it is dissolved in"),
        Moment("expires_at", "use-by"),
        NOTE,
    ),
    key=("standard",),
)
CALIBRATIONS = Sheet(
    "calibrations",
    "calibration",
    "one probe measured with standards of known concentration",
    (
        Label("calibration", "label", required=True),
        PROBE,
        AT,
        Choice("stage", "relative to the run", required=True, choices=("pre", "interim", "post")),
        Link("analyte", "what was measured", required=True, to="analytes"),
        Link("waveform", "waveform applied", required=True, to="waveforms"),
        Word("medium", "buffer", kind="medium"),
        Number("temperature_c", "temperature of the buffer", unit=units.TEMPERATURE_C, least=-20, most=110),
        Link("standard", "label of the standard", to="standards"),
        Label("rig", "which rig"),
        BY,
        current("noise_na", "standard deviation of the signal at rest", least=0),
        current("background_na", "background charging current"),
        potential("oxidation_peak_v", "potential of the oxidation peak"),
        potential("reduction_peak_v", "potential of the reduction peak"),
        Number(
            "sensitivity_na_um",
            "sensitivity of an old record that kept only the factor",
            unit=units.SENSITIVITY_NA_UM,
        ),
        Number("sensitivity_se_na_um", "its standard error", unit=units.SENSITIVITY_NA_UM, least=0),
        NOTE,
    ),
    key=("calibration",),
)
POINT_UM = Number("concentration_um", "concentration", required=True, unit=units.CONCENTRATION_UM, least=0)
POINT_NA = Number("current_na", "current", required=True, unit=units.CURRENT_NA)
POINTS = Sheet(
    "calibration_points",
    "point",
    "the raw points; a repeated concentration is a replicate",
    (
        Link("calibration", "label of the calibration", required=True, to="calibrations"),
        POINT_UM,
        POINT_NA,
    ),
    key=(),
)
EXPOSURES = Sheet(
    "exposures",
    "exposure",
    "time in tissue or flow, under a waveform",
    (
        PROBE,
        Moment("start", "when it began", required=True),
        minutes(required=True),
        Word("setting", "where the probe was", required=True, kind="setting"),
        Link("waveform", "waveform applied", to="waveforms"),
        Word("medium", "what it was in", kind="medium"),
        Text("subject", "the lab's own code of the preparation"),
        Text("recording", "name of the recording"),
        BY,
        NOTE,
    ),
    key=("electrode", "start"),
)
RETIREMENTS = Sheet(
    "retirements",
    "retirement",
    "the end of a probe's use",
    (PROBE, AT, Word("reason", "why", required=True, kind="retirement reason"), NOTE),
    key=("electrode",),
)
LIMITS = Sheet(
    "limits",
    "limit",
    "what the lab demands of a probe",
    (
        Label("rule", "which limit", required=True),
        Link("analyte", "for this analyte only", to="analytes"),
        Label("project", "for this project only"),
        Number("value", "the limit, in the rule's unit", required=True),
        Choice("origin", "where it comes from", required=True, choices=("lab decision", "common practice")),
        NOTE,
    ),
    key=("rule", "analyte", "project"),
    exchanged=False,
)

# In an order in which every link points backwards, which import and export follow.
SHEETS = (
    TERMS,
    ANALYTES,
    WAVEFORMS,
    BATCHES,
    ELECTRODES,
    INSPECTIONS,
    COATINGS,
    CONDITIONINGS,
    CLEANINGS,
    RECUTS,
    STANDARDS,
    CALIBRATIONS,
    POINTS,
    EXPOSURES,
    RETIREMENTS,
    LIMITS,
)
BY_NAME = {sheet.name: sheet for sheet in SHEETS}
EVENTS = tuple(sheet for sheet in SHEETS if sheet.time_column)
