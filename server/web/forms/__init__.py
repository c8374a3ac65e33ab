"""Form fields to commands."""
