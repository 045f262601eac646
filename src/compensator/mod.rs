//! Networks around the error amplifier, parts from poles and zeros and back, placement.
