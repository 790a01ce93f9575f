"""What stands in every report and below every result."""

CAUTION = (
    "Results describe a model; they are not for clinical decisions. Stimulation or treatment is a matter for "
    "licensed practice and local rules."
)
