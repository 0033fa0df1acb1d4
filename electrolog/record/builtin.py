"""What a new record knows from the start: the trade's analytes, waveforms and words, by generic names.

CAS numbers and molar masses: masses are recomputed in the tests from IUPAC's abridged standard atomic weights.
The waveforms are common practice; a lab amends what it does otherwise, and adds its own.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from electrolog.record import sheets
from electrolog.record.columns import Value

if TYPE_CHECKING:
    from electrolog.record.store import Record

REASON = "built in"

# name, abbreviation, CAS number, molar mass of the free base or acid in g/mol
ANALYTES = (
    ("dopamine", "DA", "51-61-6", 153.181),
    ("norepinephrine", "NE", "51-41-2", 169.18),
    ("epinephrine", "EPI", "51-43-4", 183.207),
    ("3,4-dihydroxyphenylacetic acid", "DOPAC", "102-32-9", 168.148),
    ("homovanillic acid", "HVA", "306-08-1", 182.175),
    ("3-methoxytyramine", "3-MT", "554-52-9", 167.208),
    ("serotonin", "5-HT", "50-67-9", 176.219),
    ("5-hydroxyindole-3-acetic acid", "5-HIAA", "54-16-0", 191.186),
    ("melatonin", "MEL", "73-31-4", 232.283),
    ("tyramine", "TA", "51-67-2", 137.182),
    ("octopamine", "OA", "104-14-3", 153.181),
    ("histamine", "HA", "51-45-6", 111.148),
    ("adenosine", "ADO", "58-61-7", 267.245),
    ("ascorbic acid", "AA", "50-81-7", 176.124),
    ("uric acid", "UA", "69-93-2", 168.112),
    ("hydrogen peroxide", "H2O2", "7722-84-1", 34.014),
)

# name, vertices in V, scan rate in V/s, scans per second, note
WAVEFORMS = (
    ("triangle", "-0.4 1.3 -0.4", 400.0, 10.0, "catecholamines; common practice"),
    ("serotonin-n", "0.2 1 -0.1 0.2", 1000.0, 10.0, "N-shaped sweep for serotonin; common practice"),
    (
        "serotonin-n-extended",
        "0.2 1.3 -0.1 0.2",
        1000.0,
        10.0,
        "N-shaped sweep that ends higher: fouls less, more sensitive; common practice",
    ),
)

WORDS: dict[str, tuple[str, ...]] = {
    "fibre": ("carbon fibre 5 um", "carbon fibre 7 um", "carbon fibre 10 um", "carbon fibre 30 um"),
    "insulation": ("glass capillary", "fused silica", "quartz capillary", "polyimide"),
    "seal": ("pulled glass", "epoxy", "polyimide", "wax", "none"),
    "coating material": (
        "PFSA",
        "PEDOT",
        "PEDOT:PFSA",
        "chitosan",
        "cellulose acetate",
        "polypyrrole",
        "carbon nanotubes",
        "carbon nanotubes in PFSA",
        "graphene oxide",
        "base-hydrolysed cellulose acetate",
    ),
    "coating method": ("dip", "electrodeposition", "drop", "spray", "vapour deposition"),
    "medium": ("aCSF", "PBS", "tris buffer", "HEPES buffer", "saline", "water", "air"),
    "setting": ("in-vivo", "slice", "flow-cell"),
    "cleaning method": (
        "isopropanol",
        "carbon-purified isopropanol",
        "acetone",
        "water rinse",
        "extended triangle cycling",
        "potential hold",
        "flame",
        "laser",
        "ultraviolet and ozone",
        "plasma",
    ),
    "retirement reason": (
        "fouled",
        "broken",
        "lost",
        "noisy",
        "seal failed",
        "insensitive",
        "used up",
        "left in tissue",
    ),
}


def add_all(record: Record) -> None:
    """Adds the built-in rows; who opens the record for the first time finds them journalled as such."""
    from electrolog.record import entry

    with record.writing(REASON) as writer:
        if writer.names.everything("analytes"):  # two who made the record at once: the other was first
            return
        for name, short, cas, mass in ANALYTES:
            values: dict[str, Value] = {"analyte": name, "abbreviation": short, "cas": cas, "molar_mass_g_mol": mass}
            entry.add(writer, sheets.ANALYTES, values)
        for waveform, vertices, rate, frequency, note in WAVEFORMS:
            entry.add(
                writer,
                sheets.WAVEFORMS,
                {
                    "waveform": waveform,
                    "vertices_v": vertices,
                    "scan_rate_v_s": rate,
                    "frequency_hz": frequency,
                    "note": note,
                },
            )
