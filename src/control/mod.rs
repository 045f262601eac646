//! What joins stage and compensator: the modulator and its delay.
