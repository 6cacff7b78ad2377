//! A spectrum becomes bands: continuum, centres, widths, noise.
