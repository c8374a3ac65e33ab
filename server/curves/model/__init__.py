"""The model fit: charge balance, parameters, scatter, uncertainty, and the lag of a probe."""
