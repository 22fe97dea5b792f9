"""How one transistor behaves in every region of inversion: charge, current, conductances, noise, mismatch.

Relations of a device alone, in SI floats and numpy arrays over conditions; what a circuit makes of
them belongs in engine.
"""
