"""Independent answers, slow and of many digits, that the tests hold winze against."""
