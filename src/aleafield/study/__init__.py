"""From a study file to its answers: reading, checking, planning, running; sees both halves."""
