"""From a run to result objects: arrays, errors, units, notes. No printing, no drawing."""
