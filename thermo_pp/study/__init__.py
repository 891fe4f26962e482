"""The study file: its keys, how it is loaded, and the stages it runs."""
