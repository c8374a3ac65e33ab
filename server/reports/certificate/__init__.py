"""The certificate on paper: what it is told, and its PDF."""
