"""What leaves the laboratory: a sheet in, bytes out."""
