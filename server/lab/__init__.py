"""The laboratory's rules as pure functions of values and an explicit now."""
