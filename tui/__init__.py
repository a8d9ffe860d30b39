"""The workbench and the command line of winze."""
