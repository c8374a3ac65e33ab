"""The versioned calculations; a file here is never edited once a certificate rests on it."""
