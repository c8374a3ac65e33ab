"""Checks that a reviewer sees, each with figure, limit, verdict, basis and a plain sentence."""
