"""What is drawn: values in, lines of cells out."""
