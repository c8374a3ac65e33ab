"""Parts that several pages show in the same way."""
