"""What a column of a lab's book may hold."""

from __future__ import annotations

from electrolog import units
from electrolog.units import Unit

# Each field: the unit it may carry, and how labs abbreviate it (common practice).
FIELDS: dict[str, tuple[Unit | None, str]] = {
    "sensitivity_se": (
        units.SENSITIVITY_NA_UM,
        r"(std\.? ?err\w*|standard error|s\.?e\.?m?\.?|±|\+/-|error)( of (slope|sens\w*))?"
        r"|(slope|sens\w*) (s\.?e\.?m?|err\w*)",
    ),
    "sensitivity": (
        units.SENSITIVITY_NA_UM,
        r"sens\w*\.?|slopes?|(cal(ib)?(ration)?\.? ?)?factors?|cal\.? slopes?|conversion( factors?)?",
    ),
    "concentration": (units.CONCENTRATION_UM, r"conc\w*\.?|concentration|standard conc\w*|\[[^\]]+\]"),
    "current": (
        units.CURRENT_NA,
        r"currents?|i ?(ox|p|peak|max)?|peak( currents?)?|responses?|signals?|ox(idation)? currents?"
        r"|(rep\w*|trial|inj\w*)\.? ?\d+",
    ),
    "duration": (
        units.MINUTES,
        r"(run|recording|exposure|implant\w*)? ?(duration|length of run|time in (tissue|brain|slice))"
        r"|exposure( time)?|run( time)?",
    ),
    "noise": (units.CURRENT_NA, r"(rms )?noise|baseline (sd|noise)"),
    "background": (units.CURRENT_NA, r"(background|bg|charging)( current)?"),
    "oxidation_peak": (units.POTENTIAL_V, r"e ?ox|ox(idation)? (peak|potential)|peak potential"),
    "reduction_peak": (units.POTENTIAL_V, r"e ?red|red(uction)? (peak|potential)"),
    "temperature": (units.TEMPERATURE_C, r"temp\w*\.?|bath temp\w*"),
    "length": (units.LENGTH_UM, r"(exposed |fib(re|er) |cf )?length|exposed|l"),
    "diameter": (units.LENGTH_UM, r"(fib(re|er) )?diam\w*|od"),
    "electrode": (
        None,
        r"(probe|electrode|elec\.?|cfe|cfm|cfme|microelectrode|e\.?)( ?(id|no\.?|#|nr\.?|name|number|label|code))?",
    ),
    "batch": (None, r"batch( ?(id|no\.?|#))?|lot"),
    "coated": (None, r"coat(ed|ing) (on|date|day)|date (of )?coat(ed|ing)|(date|day) coated"),
    "coating": (None, r"(polymer )?coat(ing|ed)?( material| type)?|film( material)?|membrane"),
    "standard": (
        None,
        r"(da |dopamine )?(standard|std\.?)( ?(solution|id|no\.?|#|nr\.?|lot|label))?|stock( ?(solution|id|no\.?|#))?",
    ),
    "day": (
        None,
        r"(cal(ib)?(ration)?\.? |test(ed)? |exp\w*\.? |rec\w*\.? )?(date|day)( of \w+)?|datum|when|measured( on)?",
    ),
    "time": (None, r"(start )?time|clock|start(ed)?( at)?"),
    "stage": (None, r"stage|pre ?(/|or|-) ?post|when in run|before ?/ ?after|type"),
    "analyte": (None, r"analyte|compound|neurotransmitter|transmitter|drug|molecule"),
    "waveform": (None, r"waveform|wf|sweep|ramp"),
    "medium": (None, r"buffer|medium|solution|electrolyte"),
    "setting": (None, r"setting|preparation|prep\.?|where"),
    "subject": (None, r"(animal|subject|rat|mouse|slice)( ?(id|no\.?|#|code))?"),
    "recording": (None, r"(recording|data|raw)( ?(file|name|id))?|file( ?name)?"),
    "rig": (None, r"rig|set-?up|station|flow cell"),
    "by": (None, r"by|who|operator|initials|experimenter|done by|person"),
    "note": (None, r"notes?|comments?|remarks?|observations?"),
    "other": (None, r"(?!)"),  # kept in the row's note
    "derived": (  # made from the raw values, or a mere number of the row
        None,
        r"r ?(2|²|\^2|sq\w*)|lod\b.*|loq\b.*|intercept|n|#|no\.?|row|index"
        r"|% ?(change|loss|left|of pre)|ratio|mean|average|avg\.?|total",
    ),
}
