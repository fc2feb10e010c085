"""Several spectra of one sample: what they say together."""
