"""The commands, one file each, loaded when called."""
