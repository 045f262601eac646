//! The power stage: topologies, operating point, averaged model, landmarks.
