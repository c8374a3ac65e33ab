"""What the laboratory does: one frozen command, one function, one effect."""
