"""The full-screen workbench."""
