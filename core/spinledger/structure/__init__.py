"""What a drawn structure is: reading, topicity, exchange, conformers."""
