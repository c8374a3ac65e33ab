"""A bench record in, a bench result out: versioned calculations, snapshot, replay."""
