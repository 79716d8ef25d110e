// placeholder until the shells exist
