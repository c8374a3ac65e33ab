"""How instruments, ware, probes and standard lots are checked, and what they then state."""
