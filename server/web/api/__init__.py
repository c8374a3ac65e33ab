"""The JSON face."""
