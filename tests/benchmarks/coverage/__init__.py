"""How often the stated interval contains the truth, over random problems with known answers."""
