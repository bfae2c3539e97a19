"""One module per format family, each with `FORMATS`, a tuple of structviz.io.format.Format. Modules here are found by themselves."""
