"""From one object to its posterior: coordinates, history kernel, model, sampling, evidence."""
