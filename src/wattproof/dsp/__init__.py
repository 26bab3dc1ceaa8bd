"""What is computed from samples: fit, residual, bands, spectrum, readings. Pure: arrays in, values out."""
