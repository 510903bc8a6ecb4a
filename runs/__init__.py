"""What a user or a pipeline touches: spec, execution, archive, command line, report."""
