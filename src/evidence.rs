//! Companions, missing bands, advice, screening.
