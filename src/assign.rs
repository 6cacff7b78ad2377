//! Levels become ranked candidates of bands.
