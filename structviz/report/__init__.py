"""An Analysis as files and text: results.json, CSV tables, annotated meshes, the summary for the terminal."""
