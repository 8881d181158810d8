"""Jobs of our own making: drawn systems, drawn troubles, and readings from physics that is not the product's."""
