"""What the laboratory reads: frozen read models for templates and JSON alike."""
