"""One-band transport through layered heterostructures: levels, transmission, density."""
