"""The commands: parse, call the library, render."""
