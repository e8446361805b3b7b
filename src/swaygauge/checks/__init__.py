"""Is a snapshot sound: measured facts, limits, rules, verdict."""
