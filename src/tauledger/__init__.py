"""tauledger reconciles the hand analysis of a transistor amplifier with its SPICE simulation."""
