"""What a person touches: scenario files, the command line, tables and figures. Nothing below imports it."""
