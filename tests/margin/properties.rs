//! What must hold for any corridor.
